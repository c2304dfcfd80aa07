//! One test per kind of problem that the service's frame can meet by itself.

use synodia::problem::Slug;

use super::support::Server;

#[test]
fn every_kind_has_a_page_for_people() {
    let server = Server::start();
    for slug in Slug::ALL {
        let path = format!("/problems/{}", slug.name());
        let page = server.get(&path);
        assert_eq!(page.status, 200, "{path}");
        let text = String::from_utf8(page.body).unwrap();
        assert!(text.contains(slug.title()) && !text.contains('{') | text.contains("<style>"), "{text}");
        let plain = server.get_with(&path, "accept: text/plain\r\n");
        assert!(String::from_utf8(plain.body).unwrap().contains(slug.explanation()));
    }
    let unknown = server.get("/problems/none").problem("not-found");
    assert_eq!(unknown["known"].as_array().unwrap().len(), Slug::ALL.len());
}

#[test]
fn the_kinds_are_those_of_the_contract() {
    let table: Vec<(&str, u16)> =
        Slug::ALL.iter().map(|slug| (slug.name(), slug.status().as_u16())).collect();
    assert_eq!(
        table,
        [
            ("malformed-json", 400),
            ("unauthorized", 401),
            ("not-found", 404),
            ("method-not-allowed", 405),
            ("not-acceptable", 406),
            ("unsupported-media-type", 415),
            ("request-timeout", 408),
            ("content-too-large", 413),
            ("invalid-request", 422),
            ("work-limit", 422),
            ("wall-time-limit", 422),
            ("no-convergence", 422),
            ("no-such-member", 422),
            ("no-such-family", 422),
            ("no-manifold", 422),
            ("rate-limited", 429),
            ("internal", 500),
            ("overloaded", 503),
        ]
    );
}

#[test]
fn unknown_paths_are_not_found() {
    let server = Server::start();
    let body = server.get("/v1/nothing?x=1").problem("not-found");
    assert_eq!(body["instance"], "/v1/nothing");
}

#[test]
fn wrong_methods_are_told_the_right_ones() {
    let server = Server::start();
    let reply = server.send("DELETE /livez HTTP/1.1\r\nhost: t\r\nconnection: close\r\n\r\n");
    reply.problem("method-not-allowed");
    assert_eq!(reply.header("allow"), "GET,HEAD");
}

#[test]
fn unacceptable_representations_are_listed() {
    let server = Server::start();
    let body = server.get_with("/v1/limits", "accept: text/html\r\n").problem("not-acceptable");
    assert_eq!(body["offered"][0], "application/json");
    assert_eq!(body["errors"][0]["header"], "accept");
}

#[test]
fn unknown_parameters_are_invalid() {
    let server = Server::start();
    let body = server.get("/v1/limits?units=km&x").problem("invalid-request");
    assert_eq!(body["errors"].as_array().unwrap().len(), 2);
    assert_eq!(body["errors"][0]["parameter"], "units");
}
