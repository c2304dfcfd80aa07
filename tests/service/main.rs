//! Tests of the service.
