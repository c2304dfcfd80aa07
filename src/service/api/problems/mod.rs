//! `GET /problems/{slug}`: what a kind of problem means, for a person.

use axum::response::Response;
use http::HeaderMap;

use crate::answer::{Document, negotiation::negotiate};
use crate::extract::Segment;
use crate::problem::{Problem, Slug};

const HTML: &str = "text/html; charset=utf-8";
const TEXT: &str = "text/plain; charset=utf-8";

/// What a kind of problem means
///
/// A page for a person, or plain text by `Accept`.
#[utoipa::path(get, path = "/problems/{slug}", tag = "server",
    params(("slug" = String, Path, description = "Last segment of a problem's `type`", example = "invalid-request")),
    responses((status = 200, description = "The explanation",
        content((String = "text/html"), (String = "text/plain")))))]
pub(crate) async fn problem(Segment(slug): Segment, headers: HeaderMap) -> Result<Response, Problem> {
    let known = Slug::ALL.iter().find(|known| known.name() == slug);
    let slug = *known.ok_or_else(|| {
        let names: Vec<&str> = Slug::ALL.iter().map(|known| known.name()).collect();
        Problem::new(Slug::NotFound, "There is no such kind of problem").with("known", names)
    })?;
    let media_type = negotiate(&headers, &[HTML, TEXT])?;
    let body = if media_type == HTML { page(slug) } else { text(slug) };
    Ok(Document::new(media_type, body).respond(&headers))
}

fn text(slug: Slug) -> String {
    format!("{}\n{} {}\n\n{}\n", slug.name(), slug.status().as_u16(), slug.title(), slug.explanation())
}

fn page(slug: Slug) -> String {
    include_str!("page.html")
        .replace("{name}", slug.name())
        .replace("{status}", slug.status().as_str())
        .replace("{title}", slug.title())
        .replace("{explanation}", &html(slug.explanation()))
}

/// Code between backticks; the explanations have nothing else to mark up.
fn html(text: &str) -> String {
    let text = text.replace('&', "&amp;").replace('<', "&lt;");
    let parts = text.split('`').enumerate();
    parts
        .map(|(index, part)| if index % 2 == 1 { format!("<code>{part}</code>") } else { part.to_owned() })
        .collect()
}
