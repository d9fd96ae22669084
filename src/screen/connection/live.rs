use std::time::{Duration, Instant};

use tokio::{select, sync::watch, time::timeout};

use super::{FeedReport, Keeper, Origin, Parcel, report};
use crate::{
    desk::Desk,
    feed::{Feed, Holder},
    screen::state::{Chronicle, Event},
};

/// Frames taken in one go at most.
const BATCH_FRAMES: usize = 64;
/// How often to look at the inputs when no frame comes.
const LOOK_AGAIN: Duration = Duration::from_secs(1);

/// Assesses every frame of a live feed until the screen is gone; returns why what was learned could not be kept.
pub async fn watch(
    mut feed: Feed,
    mut desk: Desk,
    mut holder: Holder,
    mut keeper: Option<Keeper>,
    parcels: watch::Sender<Option<Parcel>>,
) -> Option<String> {
    let mut chronicle = Chronicle::default();
    let mut feed_report = FeedReport::default();
    while !feed_report.ended {
        let batch = select! {
            biased;
            () = parcels.closed() => break,
            batch = timeout(LOOK_AGAIN, feed.next_batch(BATCH_FRAMES)) => batch,
        };
        match batch {
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
        if let Some(keeper) = &mut keeper {
            if feed_report.ended {
                keeper.save(&desk);
            } else {
                keeper.look(&desk);
            }
            tell(keeper, &mut chronicle);
            feed_report.kept = Some(keeper.report());
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
    keeper?.save(&desk).map(Into::into)
}

/// Passes on what a keeper has to say, once there is a time to say it at.
fn tell(keeper: &mut Keeper, chronicle: &mut Chronicle) {
    let Some(time) = chronicle.time() else { return };
    for text in keeper.take_news() {
        chronicle.note(Event { time, corridor: None, state: None, text });
    }
}
