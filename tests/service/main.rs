//! Tests of the service, against its router and against the real binary.
#![expect(clippy::unwrap_used, reason = "a test that cannot go on has failed")]

mod configuration;
mod decoding;
mod demo;
mod dependencies;
mod documents;
mod in_flight;
mod lifecycle;
mod network;
mod openapi;
mod pool;
mod problems;
mod support;
mod trajectories;
