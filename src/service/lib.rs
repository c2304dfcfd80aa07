//! Circular restricted three-body computations over HTTP.
//!
//! A request's way: [`server`] reads it, [`middleware`] wraps its handling, [`api`] routes it to a handler, which
//! [`extract`]s the body and hands it to an [`operation`]; that [`decode`]s it, computes in place or on the
//! [`pool`] of compute threads, and gives an [`answer`] or a [`problem`].

pub mod answer;
pub mod api;
pub mod config;
mod cors;
pub mod decode;
pub mod extract;
pub mod middleware;
pub mod openapi;
pub mod operation;
pub mod pool;
pub mod problem;
pub mod server;
pub mod state;
pub mod telemetry;
pub mod wire;
