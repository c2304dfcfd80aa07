//! The demonstration: what it tells is true, and what it shows can be repeated.

use std::process::Command;

use serde_json::Value;

use super::support::Server;

/// Runs it as from a pipe.
fn told() -> String {
    let output = Command::new(env!("CARGO_BIN_EXE_synodia")).arg("demo").env_clear().output().unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    assert!(output.stderr.is_empty(), "{}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

/// The requests that are shown, as path and body.
fn requests(story: &str) -> Vec<(String, Value)> {
    let shown = story.split("curl -s http://127.0.0.1:8080").skip(1);
    let parts = shown.map(|rest| {
        let (path, rest) = rest.split_once(" -H 'content-type: application/json' -d '\n").unwrap();
        let (body, _) = rest.split_once("}'\n").unwrap();
        (path.to_owned(), serde_json::from_str(&format!("{body}}}")).unwrap())
    });
    parts.collect()
}

/// The cells of the table row that begins with `name`, in the chapter that begins with `chapter`.
fn row<'a>(story: &'a str, chapter: &str, name: &str) -> Vec<&'a str> {
    let chapter = story.split_once(chapter).unwrap().1;
    let cells = |line: &'a str| line.trim_matches('|').split('|').map(str::trim).collect::<Vec<_>>();
    let mut rows = chapter.lines().filter(|line| line.starts_with('|')).map(cells);
    rows.find(|cells| cells[0] == name).unwrap_or_else(|| panic!("{name} in {chapter}"))
}

fn number(cell: &str) -> f64 {
    cell.split(' ').next().unwrap().parse().unwrap()
}

#[track_caller]
fn close(cell: &str, value: &Value, half_a_digit: f64) {
    let value = value.as_f64().unwrap();
    assert!((number(cell) - value).abs() <= half_a_digit, "{cell} is not {value}");
}

/// The plain Jacobi constant of Szebehely 1967, Theory of Orbits, in km^2/s^2, from the gravitational parameters of the
/// invented bodies: a formula of its own.
fn jacobi_constant(position_from_larger: [f64; 3], speed: f64) -> f64 {
    let (larger, smaller, separation) = (61_250.0, 1_904.0, 148_000.0_f64);
    let rate_squared = (larger + smaller) / separation.powi(3);
    let [x, y, _] = position_from_larger;
    let barycentric = x - smaller / (larger + smaller) * separation;
    let potential = larger / x.hypot(y) + smaller / (x - separation).hypot(y);
    rate_squared * (barycentric.powi(2) + y * y) + 2.0 * potential - speed * speed
}

#[test]
fn every_number_of_the_story_comes_from_the_request_beside_it() {
    let story = told();
    let server = Server::start();
    let requests = requests(&story);
    let paths: Vec<&str> = requests.iter().map(|(path, _)| path.as_str()).collect();
    assert_eq!(paths, ["/v1/equilibria", "/v1/jacobi", "/v1/trajectories", "/v1/frames/convert"]);
    let answers: Vec<Value> = requests
        .iter()
        .map(|(path, body)| {
            let reply = server.post(path, body);
            assert_eq!(reply.status, 200, "{path}");
            reply.json()
        })
        .collect();
    for point in answers[0]["points"].as_array().unwrap() {
        let cells = row(&story, "1. ", point["name"].as_str().unwrap());
        close(cells[1], &point["position"][0], 0.5);
        close(cells[2], &point["position"][1], 0.5);
        close(cells[3], &point["jacobi_constant"], 5e-7);
    }
    for (index, burn) in ["none, parked", "short", "medium", "long"].into_iter().enumerate() {
        let cells = row(&story, "2. ", burn);
        close(cells[2], &answers[1]["states"][index]["jacobi_constant"], 5e-7);
        close(cells[3], &answers[1]["states"][index]["above"]["L1"], 5e-7);
    }
    for (index, burn) in ["short", "medium", "long"].into_iter().enumerate() {
        let cells = row(&story, "3. ", burn);
        close(cells[2], &answers[2]["trajectories"][index]["final"]["time"], 5e-4);
    }
    assert_eq!(requests[3].1["states"][0], answers[2]["trajectories"][2]["final"], "sent back as it came");
    let arrival = &answers[3]["states"][0];
    close(row(&story, "4. ", "time since the burn")[1], &arrival["time"], 5e-4);
    let speed =
        arrival["velocity"].as_array().unwrap().iter().map(|v| v.as_f64().unwrap().powi(2)).sum::<f64>();
    close(row(&story, "4. ", "speed")[1], &speed.sqrt().into(), 5e-5);
}

#[test]
fn the_story_is_true() {
    let story = told();
    let opened = |burn| row(&story, "2. ", burn)[4];
    assert_eq!(["none, parked", "short", "medium", "long"].map(opened), ["none", "none", "L1", "L1"]);
    let ends = |burn| row(&story, "3. ", burn)[1];
    assert_eq!(
        ["short", "medium", "long"].map(ends),
        ["back near Orvane", "back near Orvane", "on Tessil's surface"]
    );
    let to_barycenter = 1_904.0 / (61_250.0 + 1_904.0) * 148_000.0;
    let l1_from_larger = number(row(&story, "1. ", "L1")[1]) + to_barycenter;
    let short_of = l1_from_larger - number(row(&story, "3. ", "medium")[4]);
    assert!((0.0..5_000.0).contains(&short_of), "{short_of} km short of L1");
    assert_eq!(row(&story, "4. ", "distance from Tessil's centre")[1], "910.000 km");
}

#[test]
fn the_constants_are_those_of_the_definition_and_last_to_the_arrival() {
    let story = told();
    let requests = requests(&story);
    let constant = |state: &Value| {
        let component = |member: &str, index: usize| state[member][index].as_f64().unwrap();
        let position = std::array::from_fn(|index| component("position", index));
        jacobi_constant(position, component("velocity", 0).hypot(component("velocity", 1)))
    };
    let departure = constant(&requests[1].1["states"][3]);
    close(row(&story, "2. ", "long")[2], &departure.into(), 5.1e-7);
    let arrival = constant(&requests[3].1["states"][0]);
    assert!((arrival - departure).abs() < 1e-13, "{arrival} {departure}");
}

#[test]
fn it_fits_a_page_and_ends_with_the_caution() {
    let story = told();
    assert!(story.lines().all(|line| line.chars().count() <= 100));
    assert!(story.is_ascii(), "plain text where there is no terminal");
    let end: Vec<&str> = story.trim_end().lines().rev().take(3).collect();
    assert!(end[2].starts_with("Caution: the model is idealised."), "{end:?}");
}
