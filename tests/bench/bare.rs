//! A bare handler with the JSON of `POST /v1/jacobi` and nothing else: no checks, no limits, no log. What the service
//! costs beyond it is what its frame costs.

use axum::routing::{get, post};
use axum::{Json, Router};
use serde::{Deserialize, Serialize};

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Request {
    system: System,
    states: Vec<State>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct System {
    mass_parameter: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct State {
    position: [f64; 3],
    velocity: [f64; 3],
}

#[derive(Serialize)]
struct Body {
    name: Option<String>,
    gm_km3_s2: Option<f64>,
    radius_km: Option<f64>,
}

#[derive(Serialize)]
struct SystemEcho {
    id: Option<String>,
    larger: Body,
    smaller: Body,
    mass_parameter: f64,
    length_km: Option<f64>,
    time_s: Option<f64>,
    velocity_km_s: Option<f64>,
    radius_larger: Option<f64>,
    radius_smaller: Option<f64>,
}

#[derive(Serialize)]
struct Frame {
    axes: &'static str,
    origin: &'static str,
    x_axis: &'static str,
}

#[derive(Serialize)]
#[expect(non_snake_case, reason = "names of the points")]
struct Points {
    L1: f64,
    L2: f64,
    L3: f64,
    L4: f64,
    L5: f64,
}

#[derive(Serialize)]
#[expect(clippy::struct_field_names, reason = "names of the contract")]
struct Energy {
    jacobi_constant: f64,
    energy: f64,
    effective_potential: f64,
    speed: f64,
    distance_to_larger: f64,
    distance_to_smaller: f64,
    region: &'static str,
    open_passages: [&'static str; 1],
    reachable_regions: [&'static str; 2],
    above: Points,
}

#[derive(Serialize)]
struct Answer {
    system: SystemEcho,
    units: &'static str,
    frame: Frame,
    jacobi_form: &'static str,
    equilibria: Points,
    states: Vec<Energy>,
}

/// Constants of the five points of the Earth-Moon system, to three digits: the bare handler computes one sum only.
const POINTS: Points =
    Points { L1: 3.188_341_1, L2: 3.172_160_4, L3: 3.012_147_1, L4: 2.987_997_1, L5: 2.987_997_1 };

async fn jacobi(Json(request): Json<Request>) -> Json<Answer> {
    let mu = request.system.mass_parameter;
    let states = request.states.iter().map(|state| energy(mu, state)).collect();
    let body = || Body { name: None, gm_km3_s2: None, radius_km: None };
    let system = SystemEcho {
        id: None,
        larger: body(),
        smaller: body(),
        mass_parameter: mu,
        length_km: None,
        time_s: None,
        velocity_km_s: None,
        radius_larger: None,
        radius_smaller: None,
    };
    let frame = Frame { axes: "rotating", origin: "barycenter", x_axis: "toward_smaller" };
    Json(Answer { system, units: "normalized", frame, jacobi_form: "plain", equilibria: POINTS, states })
}

fn energy(mu: f64, state: &State) -> Energy {
    let [x, y, z] = state.position;
    let square = |a: f64, b: f64, c: f64| a * a + b * b + c * c;
    let (r1, r2) = (square(x + mu, y, z).sqrt(), square(x - 1.0 + mu, y, z).sqrt());
    let potential = 0.5 * (x * x + y * y) + (1.0 - mu) / r1 + mu / r2;
    let [vx, vy, vz] = state.velocity;
    let c = 2.0 * potential - square(vx, vy, vz);
    Energy {
        jacobi_constant: c,
        energy: -0.5 * c,
        effective_potential: potential,
        speed: square(vx, vy, vz).sqrt(),
        distance_to_larger: r1,
        distance_to_smaller: r2,
        region: "around_larger",
        open_passages: ["L1"],
        reachable_regions: ["around_larger", "around_smaller"],
        above: Points {
            L1: c - POINTS.L1,
            L2: c - POINTS.L2,
            L3: c - POINTS.L3,
            L4: c - POINTS.L4,
            L5: c - POINTS.L5,
        },
    }
}

#[tokio::main]
async fn main() -> std::io::Result<()> {
    let address = std::env::args().nth(1).unwrap_or_else(|| "127.0.0.1:8081".to_owned());
    let router = Router::new()
        .route("/livez", get(async || "{\"status\":\"live\"}"))
        .route("/v1/jacobi", post(jacobi));
    axum::serve(tokio::net::TcpListener::bind(address).await?, router).await
}
