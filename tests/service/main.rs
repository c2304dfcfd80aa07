//! Tests of the service, against its router and against the real binary.
#![expect(clippy::unwrap_used, reason = "a test that cannot go on has failed")]

mod configuration;
mod decoding;
mod demo;
mod dependencies;
mod documents;
mod equilibria;
mod frames_convert;
mod in_flight;
mod jacobi;
mod lifecycle;
mod network;
mod openapi;
mod pool;
mod problems;
mod router;
mod streams;
mod support;
mod systems;
mod trajectories;
mod units_convert;
