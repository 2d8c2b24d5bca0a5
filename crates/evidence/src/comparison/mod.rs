//! What evidences say when they are compared, and what they cannot bear.

mod agreement;
mod average;
mod bound;
mod consistency;
mod look_elsewhere;
mod odds;
mod width;

pub use agreement::{Agreement, Disagreement, TOLERATED_ERRORS, TOLERATED_NATS, agreement, chosen};
pub use average::{WeightedDraws, WeightedSummary, average};
pub use bound::largest_odds;
pub use consistency::{Consistency, Fitted, consistency};
pub use look_elsewhere::{GlobalTail, global_tail};
pub use odds::{Odds, odds};
pub use width::{DECISIVE_FACTOR, Turning, Verdict, WidthCurve, width_curve};
