//! HTTP service for circular restricted three-body computations.
