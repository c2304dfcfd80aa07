//! The published contract: the committed file is the served document, and it is sound.

use std::collections::{BTreeMap, BTreeSet};

use serde_json::Value;

use super::support::Server;

fn committed() -> Value {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/../../openapi/openapi.json");
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
}

fn operations(document: &Value) -> Vec<(String, String, Value)> {
    let paths = document["paths"].as_object().unwrap();
    let each = paths.iter().flat_map(|(path, item)| {
        let item = item.as_object().unwrap();
        item.iter().map(|(method, operation)| (path.clone(), method.to_uppercase(), operation.clone()))
    });
    each.collect()
}

#[test]
fn the_committed_document_is_the_one_served() {
    let served: Value = Server::start().get("/openapi.json").json();
    assert_eq!(served, committed(), "regenerate it: cargo run --release -- openapi > openapi/openapi.json");
}

/// Every value under a key of that name, at any depth.
fn under<'a>(value: &'a Value, name: &str, found: &mut Vec<&'a Value>) {
    match value {
        Value::Object(members) => {
            for (key, member) in members {
                if key == name {
                    found.push(member);
                }
                under(member, name, found);
            }
        }
        Value::Array(items) => items.iter().for_each(|item| under(item, name, found)),
        _ => {}
    }
}

#[test]
fn no_reference_dangles_and_every_schema_is_used() {
    let document = committed();
    let mut references = Vec::new();
    under(&document, "$ref", &mut references);
    let used: BTreeSet<&str> = references.iter().filter_map(|reference| reference.as_str()).collect();
    for reference in &used {
        let pointer = reference.strip_prefix('#').unwrap();
        assert!(document.pointer(pointer).is_some(), "{reference}");
    }
    for name in document["components"]["schemas"].as_object().unwrap().keys() {
        assert!(used.contains(&*format!("#/components/schemas/{name}")), "{name} is not used");
    }
}

#[test]
fn names_are_not_shared_by_different_things() {
    // Each object schema's description comes from its type: two types with one name would show only one of them.
    let document = committed();
    let mut descriptions: BTreeMap<String, &str> = BTreeMap::new();
    for (name, schema) in document["components"]["schemas"].as_object().unwrap() {
        let description =
            schema["description"].as_str().unwrap_or_else(|| panic!("{name} has no description"));
        assert!(descriptions.insert(description.to_owned(), name).is_none(), "{name} has a double");
    }
    let ids: Vec<String> = operations(&document)
        .iter()
        .map(|(_, _, operation)| operation["operationId"].as_str().unwrap().to_owned())
        .collect();
    assert_eq!(ids.iter().collect::<BTreeSet<_>>().len(), ids.len(), "{ids:?}");
}

#[test]
fn everything_is_described() {
    let document = committed();
    for (path, method, operation) in operations(&document) {
        let place = format!("{method} {path}");
        assert!(operation["summary"].is_string(), "{place} has no summary");
        let responses = operation["responses"].as_object().unwrap();
        for (status, response) in responses {
            assert!(
                response["description"].as_str().is_some_and(|text| !text.is_empty()),
                "{place} {status}"
            );
        }
        for status in ["200", "4XX", "5XX"] {
            assert!(responses.contains_key(status), "{place} has no {status}");
        }
    }
    for (name, schema) in document["components"]["schemas"].as_object().unwrap() {
        for (member, property) in schema["properties"].as_object().into_iter().flatten() {
            // A member that may be null has its description beside the reference.
            let mut descriptions = Vec::new();
            under(property, "description", &mut descriptions);
            assert!(!descriptions.is_empty(), "{name}.{member} is not described: {property}");
        }
    }
    assert!(document["info"]["description"].as_str().unwrap().contains("not for operating a spacecraft"));
}

/// Requests are closed, answers are open: a client must not rely on there being no more members.
#[test]
fn requests_are_closed_and_answers_open() {
    let document = committed();
    let mut of_requests = BTreeSet::new();
    let mut of_answers = BTreeSet::new();
    for (_, _, operation) in operations(&document) {
        reach(&document, &operation["requestBody"], &mut of_requests);
        reach(&document, &operation["responses"], &mut of_answers);
    }
    for name in &of_requests {
        let schema = &document["components"]["schemas"][name];
        if schema["type"] == "object" {
            assert_eq!(schema["additionalProperties"], false, "{name}");
        }
    }
    for name in &of_answers {
        assert!(document["components"]["schemas"][name]["additionalProperties"] != false, "{name}");
    }
}

/// The names of the schemas that can be reached from `value`.
fn reach(document: &Value, value: &Value, names: &mut BTreeSet<String>) {
    let mut references = Vec::new();
    under(value, "$ref", &mut references);
    for reference in references {
        let name = reference.as_str().unwrap().rsplit('/').next().unwrap().to_owned();
        if names.insert(name.clone()) {
            reach(document, &document["components"]["schemas"][&name], names);
        }
    }
}

/// Every operation with a body has an example, which is answered, and whose answer has the members of its schema.
#[test]
fn every_example_runs() {
    let server = Server::start();
    let document = committed();
    for (path, method, operation) in operations(&document) {
        let reply = match method.as_str() {
            "GET" => server.get(&fill(&path, &operation)),
            "POST" => {
                let content = &operation["requestBody"]["content"]["application/json"];
                let example =
                    content["example"].as_object().unwrap_or_else(|| panic!("{path} has no example"));
                let body = serde_json::to_string(example).unwrap();
                server.send(&format!(
                    "POST {path} HTTP/1.1\r\nhost: t\r\nconnection: close\r\ncontent-type: application/json\r\n\
                     content-length: {}\r\n\r\n{body}",
                    body.len()
                ))
            }
            other => panic!("{other} {path}"),
        };
        assert_eq!(reply.status, 200, "{method} {path}: {}", String::from_utf8_lossy(&reply.body));
        let schema = &operation["responses"]["200"]["content"]["application/json"]["schema"];
        if let Some(reference) = schema["$ref"].as_str() {
            let schema = document.pointer(&reference[1..]).unwrap();
            let answer = reply.json();
            for member in schema["required"].as_array().into_iter().flatten() {
                assert!(answer.get(member.as_str().unwrap()).is_some(), "{path}: {member} in {answer}");
            }
        }
    }
}

/// The path with its parameters replaced by their examples.
fn fill(path: &str, operation: &Value) -> String {
    let parameters = operation["parameters"].as_array().into_iter().flatten();
    parameters.filter(|parameter| parameter["in"] == "path").fold(path.to_owned(), |path, parameter| {
        let name = parameter["name"].as_str().unwrap();
        let example =
            parameter["example"].as_str().unwrap_or_else(|| panic!("{path}: {name} has no example"));
        path.replace(&format!("{{{name}}}"), example)
    })
}
