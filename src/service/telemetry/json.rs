//! A log line as one flat JSON object, written straight into the line's buffer: the general formatter of the library
//! took as long as answering a small request.

use std::fmt::{self, Debug};

use tracing::field::{Field, Visit};
use tracing::{Event, Subscriber};
use tracing_subscriber::fmt::format::Writer;
use tracing_subscriber::fmt::time::{FormatTime, SystemTime};
use tracing_subscriber::fmt::{FmtContext, FormatEvent, FormatFields};
use tracing_subscriber::registry::LookupSpan;

/// Formats an event with its time, level and fields.
pub(super) struct Json;

impl<S, N> FormatEvent<S, N> for Json
where
    S: Subscriber + for<'a> LookupSpan<'a>,
    N: for<'a> FormatFields<'a> + 'static,
{
    fn format_event(
        &self,
        _: &FmtContext<'_, S, N>,
        mut writer: Writer<'_>,
        event: &Event<'_>,
    ) -> fmt::Result {
        writer.write_str("{\"timestamp\":\"")?;
        SystemTime.format_time(&mut writer)?;
        writer.write_str("\",\"level\":\"")?;
        writer.write_str(event.metadata().level().as_str())?;
        writer.write_char('"')?;
        let mut members = Members { writer, outcome: Ok(()) };
        event.record(&mut members);
        members.outcome?;
        members.writer.write_str("}\n")
    }
}

struct Members<'a> {
    writer: Writer<'a>,
    outcome: fmt::Result,
}

impl Members<'_> {
    fn add(&mut self, field: &Field, write: impl FnOnce(&mut Writer<'_>) -> fmt::Result) {
        if self.outcome.is_ok() {
            let name = field.name();
            let named = write!(self.writer, ",\"{name}\":");
            self.outcome = named.and_then(|()| write(&mut self.writer));
        }
    }
}

impl Visit for Members<'_> {
    fn record_str(&mut self, field: &Field, value: &str) {
        self.add(field, |writer| string(writer, value));
    }

    fn record_u64(&mut self, field: &Field, value: u64) {
        self.add(field, |writer| write!(writer, "{value}"));
    }

    fn record_i64(&mut self, field: &Field, value: i64) {
        self.add(field, |writer| write!(writer, "{value}"));
    }

    fn record_bool(&mut self, field: &Field, value: bool) {
        self.add(field, |writer| write!(writer, "{value}"));
    }

    fn record_f64(&mut self, field: &Field, value: f64) {
        if value.is_finite() {
            self.add(field, |writer| write!(writer, "{value:?}"));
        } else {
            self.record_debug(field, &value);
        }
    }

    fn record_debug(&mut self, field: &Field, value: &dyn Debug) {
        self.add(field, |writer| string(writer, &format!("{value:?}")));
    }
}

fn string(writer: &mut Writer<'_>, text: &str) -> fmt::Result {
    if text.bytes().any(|byte| byte < b' ' || byte == b'"' || byte == b'\\') {
        return writer.write_str(&serde_json::to_string(text).map_err(|_| fmt::Error)?);
    }
    writer.write_char('"')?;
    writer.write_str(text)?;
    writer.write_char('"')
}
