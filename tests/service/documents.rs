//! Rules for answers: entity tags, HEAD, digests, content coding, negotiation, ids, CORS.

use std::io::Read;

use sha2::Digest;

use super::support::Server;

#[test]
fn answers_of_the_build_have_a_strong_tag_and_are_not_sent_twice() {
    let server = Server::start();
    for path in ["/openapi.json", "/v1/version", "/docs", "/problems/overloaded"] {
        let first = server.get(path);
        assert_eq!(first.status, 200, "{path}");
        let tag = first.header("etag").to_owned();
        assert!(tag.starts_with('"'), "{path}: {tag}");
        for held in [tag.clone(), format!("\"other\", W/{tag}"), "*".to_owned()] {
            let again = server.get_with(path, &format!("if-none-match: {held}\r\n"));
            assert_eq!((again.status, again.body.len()), (304, 0), "{path} {held}");
            assert_eq!(again.header("etag"), tag);
        }
        assert_eq!(server.get_with(path, "if-none-match: \"other\"\r\n").status, 200);
        assert_eq!(first.header("vary"), "accept, accept-encoding");
    }
}

#[test]
fn a_coded_body_has_a_tag_of_its_own_and_no_digest() {
    let server = Server::start();
    let plain = server.get("/openapi.json");
    let coded = server.get_with("/openapi.json", "accept-encoding: gzip\r\n");
    assert_eq!(coded.header("content-encoding"), "gzip");
    assert_eq!(coded.header("repr-digest"), "");
    assert_ne!(coded.header("etag"), plain.header("etag"));
    assert!(coded.body.len() * 2 < plain.body.len());
    let held = format!("if-none-match: {}\r\naccept-encoding: gzip\r\n", coded.header("etag"));
    assert_eq!(server.get_with("/openapi.json", &held).status, 304);
    let short = server.get_with("/livez", "accept-encoding: gzip\r\n");
    assert_eq!(short.header("content-encoding"), "");
}

#[test]
fn the_digest_is_that_of_the_body() {
    // RFC 9530, section 3: `Repr-Digest: sha-256=:<base64>:`.
    let reply = Server::start().get("/v1/limits");
    let hash = base64::Engine::encode(&base64::prelude::BASE64_STANDARD, sha2::Sha256::digest(&reply.body));
    assert_eq!(reply.header("repr-digest"), format!("sha-256=:{hash}:"));
}

#[test]
fn head_is_get_without_the_body() {
    let server = Server::start();
    for path in ["/livez", "/v1/limits", "/openapi.json", "/docs", "/problems/overloaded", "/nothing"] {
        let get = server.get(path);
        let mut stream = server.connect();
        std::io::Write::write_all(
            &mut stream,
            format!("HEAD {path} HTTP/1.1\r\nhost: t\r\nconnection: close\r\n\r\n").as_bytes(),
        )
        .unwrap();
        let mut text = String::new();
        stream.read_to_string(&mut text).unwrap();
        let (head, body) = text.split_once("\r\n\r\n").unwrap();
        assert_eq!(body, "", "{path}");
        assert!(head.starts_with(&format!("HTTP/1.1 {}", get.status)), "{path}: {head}");
        for name in ["content-type", "repr-digest", "etag"] {
            let value = get.header(name);
            assert!(value.is_empty() || head.contains(value), "{path}: {name}: {value} in {head}");
        }
        assert!(head.contains("content-length: "), "{path}: {head}");
    }
}

#[test]
fn representations_are_negotiated_by_quality() {
    // RFC 9110, section 12.5.1: the most specific range counts, then its quality.
    let server = Server::start();
    let media_type = |accept: &str| {
        let reply = server.get_with("/problems/overloaded", &format!("accept: {accept}\r\n"));
        (reply.status, reply.header("content-type").to_owned())
    };
    let html = (200, "text/html; charset=utf-8".to_owned());
    let text = (200, "text/plain; charset=utf-8".to_owned());
    assert_eq!(media_type("*/*"), html);
    assert_eq!(media_type("text/plain"), text);
    assert_eq!(media_type("text/*;q=0.5, text/plain"), text);
    assert_eq!(media_type("text/html;q=0.3, */*;q=0.8"), text);
    assert_eq!(media_type("text/plain;q=0, text/*"), html);
    assert_eq!(media_type("image/png").0, 406);
    assert_eq!(media_type("text/html;q=0").0, 406);
}

#[test]
fn a_sane_request_id_is_taken_and_any_other_replaced() {
    let server = Server::start();
    let id = |given: &str| {
        server.get_with("/livez", &format!("x-request-id: {given}\r\n")).header("x-request-id").to_owned()
    };
    assert_eq!(id("abc-1_2.3:4"), "abc-1_2.3:4");
    for wild in ["a b", "a\"b", &"x".repeat(129)] {
        let made = id(wild);
        assert!(made.len() == 32 && made.bytes().all(|byte| byte.is_ascii_hexdigit()), "{made}");
    }
    assert_ne!(id("a b"), id("a b"));
}

#[test]
fn every_request_has_its_line_in_the_log() {
    let server = Server::start();
    // The example of the W3C Trace Context recommendation, section 3.2.
    let trace = "00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7-01";
    let _ = server.get_with("/problems/internal", &format!("x-request-id: mine\r\ntraceparent: {trace}\r\n"));
    let line = server.log(|line| line["request_id"] == "mine");
    assert_eq!(line["method"], "GET");
    assert_eq!(line["path"], "/problems/{slug}");
    assert_eq!(line["status"], 200);
    assert_eq!(line["trace_id"], "4bf92f3577b34da6a3ce929d0e0e4736");
    assert_eq!(line["parent_id"], "00f067aa0ba902b7");
    assert!(line["duration_us"].is_u64() && line["steps"].is_u64() && line["outcome"].is_string(), "{line}");
    let _ = server.get_with("/livez", "x-request-id: wild\r\ntraceparent: 00-0-0-0\r\n");
    assert!(server.log(|line| line["request_id"] == "wild").get("trace_id").is_none());
}

#[test]
fn pages_of_configured_origins_may_call_and_others_may_not() {
    let server = Server::with(&[("SYNODIA_CORS_ORIGINS", "https://pages.example")]);
    let preflight = |origin: &str| {
        server.send(&format!(
            "OPTIONS /v1/limits HTTP/1.1\r\nhost: t\r\nconnection: close\r\norigin: {origin}\r\n\
             access-control-request-method: POST\r\naccess-control-request-headers: content-type\r\n\r\n"
        ))
    };
    let good = preflight("https://pages.example");
    assert_eq!(good.status, 200);
    assert_eq!(good.header("access-control-allow-origin"), "https://pages.example");
    for name in ["content-type", "authorization", "accept", "x-request-id", "traceparent", "if-none-match"] {
        assert!(good.header("access-control-allow-headers").contains(name), "{name}");
    }
    assert_eq!(preflight("https://others.example").header("access-control-allow-origin"), "");
    let refused = server.get_with("/nothing", "origin: https://pages.example\r\n");
    refused.problem("not-found");
    assert_eq!(refused.header("access-control-allow-origin"), "https://pages.example");
    for name in ["etag", "repr-digest", "x-request-id", "retry-after", "www-authenticate", "server-timing"] {
        assert!(refused.header("access-control-expose-headers").contains(name), "{name}");
    }
    let without = Server::start();
    assert_eq!(
        without.get_with("/livez", "origin: https://x.example\r\n").header("access-control-allow-origin"),
        ""
    );
}

#[test]
fn the_page_asks_nothing_of_the_network() {
    let page = Server::start().get("/docs");
    let text = String::from_utf8(page.body.clone()).unwrap();
    let policy = page.header("content-security-policy");
    assert!(policy.contains("default-src 'none'") && policy.contains("connect-src 'self'"), "{policy}");
    for foreign in ["http://", "https://", "src=\"", "@import", "url("] {
        assert!(!text.contains(foreign), "{foreign}");
    }
}
