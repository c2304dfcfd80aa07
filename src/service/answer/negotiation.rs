//! Content negotiation by `Accept` (RFC 9110, section 12.5.1).

use http::{HeaderMap, header};

use crate::problem::Problem;

/// The first of `offered` that the client likes best.
///
/// # Errors
/// `not-acceptable` with the list if it likes none.
pub fn negotiate(headers: &HeaderMap, offered: &[&'static str]) -> Result<&'static str, Problem> {
    let mut fields = headers.get_all(header::ACCEPT).iter().peekable();
    let Some(first) = offered.first() else { return Err(Problem::not_acceptable(offered)) };
    let usual = |value: &[u8]| value == b"*/*" || value == first.as_bytes();
    if fields.peek().is_none_or(|value| usual(value.as_bytes())) {
        return Ok(first);
    }
    let ranges: Vec<(&str, f32)> = fields
        .filter_map(|value| value.to_str().ok())
        .flat_map(|value| value.split(','))
        .filter_map(range)
        .collect();
    let quality = |media_type: &str| {
        let matching = ranges.iter().filter_map(|(range, quality)| {
            let specificity = specificity(range, media_type)?;
            Some((specificity, *quality))
        });
        matching.max_by_key(|(specificity, _)| *specificity).map_or(0.0, |(_, quality)| quality)
    };
    let mut best = None;
    for media_type in offered {
        let quality = quality(media_type);
        if quality > best.map_or(0.0, |(_, quality)| quality) {
            best = Some((*media_type, quality));
        }
    }
    best.map(|(media_type, _)| media_type).ok_or_else(|| Problem::not_acceptable(offered))
}

/// A media range and its quality; parameters other than the quality do not narrow anything that is offered.
fn range(element: &str) -> Option<(&str, f32)> {
    let mut parts = element.split(';').map(str::trim);
    let range = parts.next().filter(|range| !range.is_empty())?;
    let mut quality = 1.0;
    for parameter in parts {
        if let Some(value) = parameter.strip_prefix("q=").or_else(|| parameter.strip_prefix("Q=")) {
            quality = value.parse().ok().filter(|quality| (0.0..=1.0).contains(quality))?;
        }
    }
    Some((range, quality))
}

fn specificity(range: &str, media_type: &str) -> Option<u8> {
    let same = range.eq_ignore_ascii_case(media_type.split(';').next().unwrap_or_default());
    let (kind, _) = media_type.split_once('/')?;
    match range.split_once('/')? {
        _ if same => Some(2),
        (wanted, "*") if wanted.eq_ignore_ascii_case(kind) => Some(1),
        ("*", "*") => Some(0),
        _ => None,
    }
}
