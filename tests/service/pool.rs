//! The compute threads. Cancellation is observed by polls and signals, never by time.

use std::sync::{Arc, mpsc};
use std::time::Duration;

use mechanics::interrupt::{Interrupt, Stop};
use synodia::config::Compute;
use synodia::pool::{Context, Pool};

use super::support::PATIENCE;

fn pool(threads: usize, queue: usize) -> Pool {
    Pool::start(Compute { threads, queue }).unwrap()
}

/// Polls until told to stop.
fn poll_on(interrupt: &dyn Interrupt) -> Stop {
    loop {
        if let Some(stop) = interrupt.poll() {
            return stop;
        }
        std::thread::yield_now();
    }
}

#[tokio::test]
async fn a_full_queue_refuses_at_once_and_a_place_is_free_again_after() {
    let pool = pool(1, 1);
    let (release, held) = mpsc::channel::<()>();
    let held = Arc::new(std::sync::Mutex::new(held));
    let jobs: Vec<_> = (0..2)
        .map(|_| {
            let (pool, held) = (pool.clone(), Arc::clone(&held));
            tokio::spawn(async move { pool.run(move |_| held.lock().unwrap().recv().is_ok()).await })
        })
        .collect();
    tokio::task::yield_now().await;
    while pool.free_places() > 0 {
        tokio::task::yield_now().await;
    }
    let refused = pool.run(|_| ()).await.unwrap_err();
    assert_eq!(refused.slug().name(), "overloaded");
    release.send(()).unwrap();
    release.send(()).unwrap();
    for job in jobs {
        assert!(job.await.unwrap().unwrap());
    }
    assert!(pool.run(|_| ()).await.is_ok());
}

#[tokio::test]
async fn dropping_the_answer_stops_the_computation_at_its_next_poll() {
    let pool = pool(1, 0);
    let (begin, begun) = tokio::sync::oneshot::channel();
    let (end, ended) = mpsc::channel();
    let work = pool.run(move |context: &Context| {
        begin.send(()).unwrap();
        end.send(poll_on(context.interrupt())).unwrap();
    });
    tokio::select! {
        _ = work => panic!("it cannot end by itself"),
        begun = begun => begun.unwrap(),
    }
    assert_eq!(ended.recv_timeout(PATIENCE), Ok(Stop::Cancelled));
}

#[tokio::test]
async fn wall_time_counts_from_the_grant() {
    let stop = pool(1, 0)
        .run(|context: &Context| {
            assert_eq!(context.interrupt().poll(), None);
            context.grant(Duration::ZERO);
            context.grant(PATIENCE);
            poll_on(context.interrupt())
        })
        .await;
    assert_eq!(stop.unwrap(), Stop::WallTime);
}

/// As it does while a stream waits for its reader.
#[test]
fn a_clock_that_is_held_does_not_run_out() {
    let place = pool(1, 0).place().unwrap();
    let watch = place.watch();
    watch.run_out_in(PATIENCE);
    let left = watch.hold();
    assert!(left > Duration::ZERO && left <= PATIENCE);
    watch.run_out_in(Duration::ZERO);
    assert_eq!(watch.poll(), Some(Stop::WallTime));
    assert_eq!(watch.hold(), Duration::ZERO);
    assert_eq!(watch.poll(), None);
}

#[tokio::test]
async fn closing_cancels_what_runs() {
    let pool = pool(1, 0);
    let closer = pool.clone();
    let stop = pool
        .run(move |context: &Context| {
            closer.close();
            poll_on(context.interrupt())
        })
        .await;
    assert_eq!(stop.unwrap(), Stop::Cancelled);
}

#[tokio::test]
async fn a_panic_reaches_the_one_who_waits_and_the_thread_lives_on() {
    let pool = pool(1, 0);
    let panicking = pool.clone();
    let joined = tokio::spawn(async move { panicking.run(|_| panic!("planned")).await }).await;
    assert!(joined.unwrap_err().is_panic());
    assert_eq!(pool.run(|_| 1).await.unwrap(), 1);
}
