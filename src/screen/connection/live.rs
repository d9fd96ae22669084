use std::time::{Duration, Instant};

use tokio::{sync::watch, time::timeout};

use super::{FeedReport, Origin, Parcel, report};
use crate::{
    desk::Desk,
    feed::{Feed, Holder},
    screen::state::Chronicle,
};

/// Frames taken in one go at most.
const BATCH_FRAMES: usize = 64;
/// How often to look at the inputs when no frame comes.
const LOOK_AGAIN: Duration = Duration::from_secs(1);

/// Assesses every frame of a live feed until it ends and the screen is gone.
pub async fn watch(mut feed: Feed, mut desk: Desk, mut holder: Holder, parcels: watch::Sender<Option<Parcel>>) {
    let mut chronicle = Chronicle::default();
    let mut feed_report = FeedReport::default();
    while !feed_report.ended && !parcels.is_closed() {
        match timeout(LOOK_AGAIN, feed.next_batch(BATCH_FRAMES)).await {
            Err(_) => {}
            Ok(None) => feed_report.ended = true,
            Ok(Some(frames)) => {
                for frame in frames {
                    feed_report.frames += 1;
                    feed_report.arrived = Some(Instant::now());
                    if let Some(snapshot) = holder.take(&frame) {
                        chronicle.take(desk.assess(&snapshot));
                    }
                }
            }
        }
        feed_report.inputs = report::inputs(feed.monitor());
        let parcel = Parcel { chronicle: chronicle.clone(), feed: feed_report.clone(), origin: Origin::Live };
        parcels.send_if_modified(|sent| {
            let news = sent.as_ref().is_none_or(|sent| sent.feed != parcel.feed);
            if news {
                *sent = Some(parcel);
            }
            news
        });
    }
    parcels.closed().await;
}
