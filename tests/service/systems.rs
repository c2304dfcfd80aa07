//! The catalogue.

use http::Request;
use serde_json::{Value, json};

use super::router::{Local, close};

const IDS: [&str; 22] = [
    "sun-mercury",
    "sun-venus",
    "sun-earth",
    "sun-earth-and-moon",
    "sun-mars",
    "sun-jupiter",
    "sun-saturn",
    "sun-uranus",
    "sun-neptune",
    "earth-moon",
    "mars-phobos",
    "jupiter-io",
    "jupiter-europa",
    "jupiter-ganymede",
    "jupiter-callisto",
    "saturn-enceladus",
    "saturn-rhea",
    "saturn-titan",
    "uranus-titania",
    "uranus-oberon",
    "neptune-triton",
    "pluto-charon",
];

fn catalogue(service: &Local) -> Vec<Value> {
    service.get("/v1/systems").success()["systems"].as_array().unwrap().clone()
}

#[test]
fn the_catalogue_has_every_system_with_its_sources() {
    let service = Local::start();
    let systems = catalogue(&service);
    let ids: Vec<&str> = systems.iter().map(|system| system["id"].as_str().unwrap()).collect();
    assert_eq!(ids, IDS);
    for system in &systems {
        assert_eq!(
            *system,
            service.get(&format!("/v1/systems/{}", system["id"].as_str().unwrap())).success()
        );
        let sources = system["sources"].as_array().unwrap();
        for constant in sources {
            assert!(constant["source"].as_str().unwrap().len() > 20, "{constant}");
            let pointer = format!("/{}", constant["constant"].as_str().unwrap().replace('.', "/"));
            let pointer = pointer.replace("separation_km", "length_km");
            assert_eq!(system.pointer(&pointer), Some(&constant["value"]), "{pointer} of {system}");
        }
        assert_eq!(sources.len(), 6, "{system}");
    }
}

#[test]
fn constants_are_the_published_ones() {
    // Gravitational parameters: Park et al. 2021, AJ 161:105 (DE440); radii: Archinal et al. 2018, CeMDA 130:22; the Sun's:
    // IAU 2015 Resolution B3; separations: Astronomical Almanac, and Standish, Keplerian elements, Table 1.
    let service = Local::start();
    let moon = service.get("/v1/systems/earth-moon").success();
    assert_eq!(
        moon["larger"],
        json!({"name": "Earth", "gm_km3_s2": 398600.43550702266, "radius_km": 6371.0084})
    );
    assert_eq!(moon["smaller"], json!({"name": "Moon", "gm_km3_s2": 4902.80011845755, "radius_km": 1737.4}));
    assert_eq!(moon["length_km"], 384400.0);
    assert_eq!(moon["published_period_d"], 27.321661);
    let jupiter = service.get("/v1/systems/sun-jupiter").success();
    assert_eq!(jupiter["larger"]["gm_km3_s2"], 132712440041.27942);
    assert_eq!(jupiter["smaller"]["gm_km3_s2"], 126712764.1);
    assert_eq!(jupiter["larger"]["radius_km"], 695700.0);
    // The astronomical unit: IAU 2012 Resolution B2.
    close(&jupiter["length_km"], 5.202887 * 149597870.7, 1e-7);

    // Worked out at 40 digits from these gravitational parameters.
    for (id, mass_parameter) in [
        ("sun-earth", 3.003480594542363e-06),
        ("sun-earth-and-moon", 3.0404234047636514e-06),
        ("earth-moon", 0.012150584395829191),
        ("sun-jupiter", 0.000953881151934512),
        ("sun-mars", 3.22715504146e-07),
        ("mars-phobos", 1.6548716074e-08),
        ("jupiter-europa", 2.52799653374e-05),
        ("saturn-titan", 0.000236639258461),
        ("neptune-triton", 0.000208950318368),
        ("pluto-charon", 0.10877401423594767),
    ] {
        let system = service.get(&format!("/v1/systems/{id}")).success();
        close(&system["mass_parameter"], mass_parameter, 1e-11 * mass_parameter);
    }
}

#[test]
fn the_circular_period_is_close_to_the_published_one() {
    for system in catalogue(&Local::start()) {
        let number = |name: &str| system[name].as_f64().unwrap();
        let circular = std::f64::consts::TAU * number("time_s") / 86400.0;
        let misfit = circular / number("published_period_d") - 1.0;
        assert!(misfit.abs() < 6e-3, "{}: {misfit}", system["id"]);
    }
}

#[test]
fn an_entry_can_be_sent() {
    let service = Local::start();
    for entry in catalogue(&service) {
        let by_entry = service.answer("/v1/equilibria", &json!({"system": entry}));
        let by_id = service.answer("/v1/equilibria", &json!({"system": entry["id"]}));
        assert_eq!(by_entry, by_id);
    }
}

#[test]
fn an_unknown_id_is_told_the_nearest() {
    let service = Local::start();
    for path in ["/v1/systems/earth-mon", "/v1/systems/earth-mon/equilibria"] {
        let reply = service.get(path);
        assert_eq!(reply.status, 404);
        let body = reply.json();
        assert_eq!(body["type"], "/problems/not-found");
        assert!(body["detail"].as_str().unwrap().contains("did you mean `earth-moon`?"), "{body}");
    }
    assert_eq!(service.get("/v1/systems/%ff").status, 404);
    assert_eq!(service.get("/v1/systems/").status, 404);
}

#[test]
fn the_catalogue_is_cacheable_and_takes_no_parameters() {
    let service = Local::start();
    for path in [
        "/v1/systems",
        "/v1/systems/sun-jupiter",
        "/v1/systems/sun-jupiter/equilibria",
        "/v1/systems/sun-jupiter/equilibria?length=au&time=yr&origin=smaller",
    ] {
        let first = service.get(path);
        let tag = first.header("etag").to_owned();
        assert!(tag.starts_with('"') && first.header("repr-digest").starts_with("sha-256="), "{path}");
        let again = Request::get(path).header("if-none-match", &tag).body(axum::body::Body::empty());
        let again = service.send(again.unwrap());
        assert_eq!((again.status.as_u16(), again.body.len()), (304, 0), "{path}");
    }
    for path in ["/v1/systems?page=2", "/v1/systems/sun-jupiter?page=2"] {
        service.get(path).has_fault("invalid-request", "parameter", "page", "unknown parameter");
    }
    let picture = Request::get("/v1/systems").header("accept", "image/png").body(axum::body::Body::empty());
    assert_eq!(service.send(picture.unwrap()).status, 406);
}
