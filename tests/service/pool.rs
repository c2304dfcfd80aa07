//! The compute threads. Cancellation is observed by polls and signals, never by time.

use std::sync::atomic::{AtomicUsize, Ordering};
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

#[tokio::test]
async fn parts_come_in_order_whatever_the_threads() {
    for threads in [1, 2, 5] {
        let pool = pool(threads, 0);
        let parts = pool.run(|context: &Context| {
            context.parts(100, 7, |range, _| range.map(|index| index * index).collect::<Vec<_>>())
        });
        let squares: Vec<usize> = parts.await.unwrap().concat();
        assert_eq!(squares, (0..100).map(|index| index * index).collect::<Vec<_>>());
    }
}

#[tokio::test]
async fn parts_are_shared_among_threads_and_with_others() {
    let pool = pool(2, 8);
    let most = Arc::new(AtomicUsize::new(0));
    let (now, seen) = (Arc::new(AtomicUsize::new(0)), Arc::clone(&most));
    let batch = pool.run(move |context: &Context| {
        let rendezvous = Arc::new(std::sync::Barrier::new(2));
        context.parts(2, 1, move |_, _| {
            seen.fetch_max(now.fetch_add(1, Ordering::SeqCst) + 1, Ordering::SeqCst);
            rendezvous.wait();
            now.fetch_sub(1, Ordering::SeqCst);
        })
    });
    assert_eq!(batch.await.unwrap().len(), 2);
    assert_eq!(most.load(Ordering::SeqCst), 2);
}

#[tokio::test]
async fn a_panic_in_a_part_reaches_the_one_who_waits() {
    let pool = pool(2, 8);
    let joined = tokio::spawn(async move {
        let work = pool.run(|context: &Context| {
            context.parts(20, 1, |range, _| assert_ne!(range.start, 11, "planned"));
        });
        work.await
    });
    assert!(joined.await.unwrap_err().is_panic());
}

#[tokio::test]
async fn a_batch_whose_time_is_up_is_a_problem() {
    for pool in [pool(1, 0), pool(2, 0)] {
        let batch = pool.run(|context: &Context| {
            context.grant(Duration::ZERO);
            synodia::operation::batch(context, 1000, |index| index)
        });
        let problem = batch.await.unwrap().unwrap_err();
        assert_eq!(problem.slug().name(), "wall-time-limit");
        let whole = pool.run(|context: &Context| synodia::operation::batch(context, 1000, |index| index));
        assert_eq!(whole.await.unwrap().unwrap(), (0..1000).collect::<Vec<_>>());
    }
}
