//! Parts of requests and answers that several operations share.
