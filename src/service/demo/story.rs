//! The four chapters: a sentence or two, a request, its answer as a table.

use std::io::Write;

use serde_json::{Value, json};

use super::Failure;
use super::client::{Answer, Client};
use super::mission::{BURNS, Course, PARKED, SEPARATION_KM, frame, system, units};
use super::page::{Page, laid_out};

const OPENING: &str = "\
Orvane and Tessil, a planet and its moon, exist nowhere; they and the probe Linnet are
invented. The answers are real: each comes from a server that this command has started.
To repeat a request, start `synodia` and paste the command shown.";

const EQUILIBRIA: &str = "\
Linnet circles Orvane and is to reach Tessil. On the way lies L1, the lowest gap in the
barrier between the two: where is it, and how high?";

const PASSAGES: &str = "\
Three burns along the parking orbit are affordable. A lower Jacobi constant C means more
energy, and a passage is open once C is below that of its point. Which burns open the way?";

const PASSAGES_END: &str = "\
After the short burn the barrier is closed: Linnet cannot reach Tessil, however long it
flies. After the other two it may.";

const RETURN: &str = "\
An open passage is a permit and no promise. Does the probe come back to Orvane, or does
it get through? Each flight runs to its next periapsis about Orvane, to a surface, or for
two weeks.";

const RETURN_END: &str = "\
The medium burn turns back just short of L1. Hardly more carries the long one through.";

const ARRIVAL: &str = "\
The long burn reaches Tessil. Its last state, sent back as it came, is asked for in axes
that do not turn, about Tessil: that is the velocity a lander would have to take off.";

const CAUTION: &str = "\
Caution: the model is idealised. The bodies are points on circular orbits, and no other
force acts. It serves analysis and not the operation of a spacecraft; whatever is to fly
must be verified by a qualified flight-dynamics team.";

/// How long the flights are followed, in days.
const FOLLOWED: f64 = 14.0;

/// The events of the flights; their places in the request.
const FARTHEST: u64 = 0;
const CLOSEST: u64 = 1;

/// Tells the whole story.
pub(super) async fn tell<W: Write>(client: Client, page: Page<W>) -> Result<(), Failure> {
    let mut story = Story { client, page };
    story.page.heading("An invented mission: from Orvane to Tessil")?;
    story.page.text(OPENING)?;
    story.equilibria().await?;
    story.passages().await?;
    let flights = story.flights().await?;
    story.arrival(&flights).await?;
    story.page.text(CAUTION)?;
    Ok(())
}

struct Story<W> {
    client: Client,
    page: Page<W>,
}

impl<W: Write> Story<W> {
    /// Shows a request and has it answered.
    async fn ask(&mut self, path: &str, body: &Value) -> Result<Answer, Failure> {
        let body = laid_out(body);
        self.page.request(path, &body)?;
        self.client.post(path, body).await
    }

    async fn equilibria(&mut self) -> Result<(), Failure> {
        self.page.heading("1. Where the equilibria lie")?;
        self.page.text(EQUILIBRIA)?;
        let body = json!({ "system": system(), "units": units() });
        let answer = self.ask("/v1/equilibria", &body).await?;
        let mut rows = Vec::new();
        for index in 0..answer.items("/points")?.len() {
            let point = format!("/points/{index}");
            let [x, y, _] = answer.vector(&format!("{point}/position"))?;
            let growth = answer.number(&format!("{point}/linear/growth_rate"))?;
            rows.push(vec![
                answer.text(&format!("{point}/name"))?.to_owned(),
                format!("{x:.0}"),
                format!("{y:.0}"),
                format!("{:.6}", answer.number(&format!("{point}/jacobi_constant"))?),
                if growth > 0.0 {
                    format!("grows e-fold in {:.2} d", growth.recip())
                } else {
                    "stays small".to_owned()
                },
            ]);
        }
        self.page.table(&["point", "x, km", "y, km", "C, km^2/s^2", "a small displacement"], rows)?;
        Ok(())
    }

    async fn passages(&mut self) -> Result<(), Failure> {
        self.page.heading("2. Which passages a burn opens")?;
        self.page.text(PASSAGES)?;
        let courses = || [PARKED].into_iter().chain(BURNS);
        let states: Vec<Value> = courses().map(|course| course.state()).collect();
        let body = json!({ "system": system(), "units": units(), "frame": frame(), "states": states });
        let answer = self.ask("/v1/jacobi", &body).await?;
        let parked = answer.number("/states/0/speed")?;
        let mut rows = Vec::new();
        for (index, course) in courses().enumerate() {
            let state = format!("/states/{index}");
            let burn = (answer.number(&format!("{state}/speed"))? - parked) * M_PER_KM;
            rows.push(vec![
                course.name.to_owned(),
                format!("{burn:.1}"),
                format!("{:.6}", answer.number(&format!("{state}/jacobi_constant"))?),
                format!("{:+.6}", answer.number(&format!("{state}/above/L1"))?),
                answer.words(&format!("{state}/open_passages"))?,
                answer.words(&format!("{state}/reachable_regions"))?,
            ]);
        }
        self.page.table(&["burn", "m/s", "C, km^2/s^2", "above L1", "open", "can reach"], rows)?;
        self.page.text(PASSAGES_END)?;
        Ok(())
    }

    async fn flights(&mut self) -> Result<Answer, Failure> {
        self.page.heading("3. Whether the probe comes back")?;
        self.page.text(RETURN)?;
        let states: Vec<Value> = BURNS.iter().map(Course::state).collect();
        let body = json!({
            "system": system(), "units": units(), "frame": frame(),
            "initial_states": states,
            "duration": FOLLOWED,
            "events": [
                { "name": "farthest from Orvane", "when": { "apoapsis": "larger" } },
                { "name": "closest to Tessil", "when": { "periapsis": "smaller" } },
                { "name": "back near Orvane", "when": { "periapsis": "larger" }, "stop_after": 1 }
            ]
        });
        let answer = self.ask("/v1/trajectories", &body).await?;
        let mut rows = Vec::new();
        for (index, course) in BURNS.iter().enumerate() {
            let flight = format!("/trajectories/{index}");
            let end = match answer.text(&format!("{flight}/outcome"))? {
                "stopped_by_event" => "back near Orvane",
                "contact_smaller" => "on Tessil's surface",
                other => other,
            };
            let last = answer.vector(&format!("{flight}/final/position"))?;
            let farthest = distances(&answer, &flight, FARTHEST, [0.0; 3])?.into_iter().reduce(f64::max);
            let closest = distances(&answer, &flight, CLOSEST, TESSIL)?
                .into_iter()
                .chain([distance(last, TESSIL)])
                .fold(f64::INFINITY, f64::min);
            rows.push(vec![
                course.name.to_owned(),
                end.to_owned(),
                format!("{:.3}", answer.number(&format!("{flight}/final/time"))?),
                format!("{:.0}", distance(last, [0.0; 3])),
                farthest.map_or("-".to_owned(), |farthest| format!("{farthest:.0}")),
                format!("{closest:.0}"),
            ]);
        }
        let head = ["burn", "ends", "day", "from Orvane, km", "at most, km", "from Tessil at least, km"];
        self.page.table(&head, rows)?;
        let drift = answer.number("/evidence/jacobi_drift")?;
        self.page.text(&format!(
            "{RETURN_END}\nThe largest drift of C in these flights is {drift:.1e} km^2/s^2."
        ))?;
        Ok(answer)
    }

    async fn arrival(&mut self, flights: &Answer) -> Result<(), Failure> {
        self.page.heading("4. Where and how fast it arrives")?;
        self.page.text(ARRIVAL)?;
        let end = format!("/trajectories/{}/final", BURNS.len() - 1);
        let body = json!({
            "system": system(),
            "states": [flights.at(&end)?],
            "from": { "units": units(), "frame": frame() },
            "to": {
                "units": units(),
                "frame": { "axes": "inertial", "origin": "smaller" },
                "elements_about": "smaller"
            }
        });
        let answer = self.ask("/v1/frames/convert", &body).await?;
        let turning = flights.vector(&format!("{end}/position"))?;
        let position = answer.vector("/states/0/position")?;
        let velocity = answer.vector("/states/0/velocity")?;
        let (height, speed) = (distance(position, [0.0; 3]), distance(velocity, [0.0; 3]));
        let inward = -position.iter().zip(velocity).map(|(p, v)| p * v).sum::<f64>() / (height * speed);
        let longitude = turning[1].atan2(SEPARATION_KM - turning[0]).to_degrees();
        let rows = [
            ("time since the burn", format!("{:.3} d", answer.number("/states/0/time")?)),
            ("distance from Tessil's centre", format!("{height:.3} km")),
            ("longitude from where Orvane is overhead, ahead positive", format!("{longitude:.1} deg")),
            ("speed", format!("{speed:.4} km/s")),
            ("angle below the horizon", format!("{:.1} deg", inward.asin().to_degrees())),
            (
                "eccentricity of the arc about Tessil",
                format!("{:.4}", answer.number("/states/0/elements/eccentricity")?),
            ),
            (
                "its periapsis, were there no surface",
                format!("{:.0} km", answer.number("/states/0/elements/periapsis_distance")?),
            ),
        ];
        self.page.table(&["on arrival", ""], rows.map(|(what, value)| vec![what.to_owned(), value]))?;
        Ok(())
    }
}

const M_PER_KM: f64 = 1000.0;

/// Tessil's place in the frame of the flights, km.
const TESSIL: [f64; 3] = [SEPARATION_KM, 0.0, 0.0];

fn distance(from: [f64; 3], to: [f64; 3]) -> f64 {
    from.iter().zip(to).map(|(a, b)| (a - b).powi(2)).sum::<f64>().sqrt()
}

/// The distances from `place` at which an event of a flight happened.
fn distances(answer: &Answer, flight: &str, event: u64, place: [f64; 3]) -> Result<Vec<f64>, Failure> {
    let events = format!("{flight}/events");
    let mut found = Vec::new();
    for (index, occurrence) in answer.items(&events)?.iter().enumerate() {
        if occurrence["event"] == event {
            found.push(distance(answer.vector(&format!("{events}/{index}/position"))?, place));
        }
    }
    Ok(found)
}
