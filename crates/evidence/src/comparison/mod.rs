//! What evidences say when they are compared, and what they cannot bear.

mod agreement;
mod amplitudes;
mod average;
mod bound;
mod consistency;
mod look_elsewhere;
mod odds;
mod tested;
mod width;

pub use agreement::{Agreement, Disagreement, TOLERATED_ERRORS, TOLERATED_NATS, agreement, chosen};
pub use amplitudes::{Amplitudes, amplitudes};
pub use average::{WeightedDraws, WeightedSummary, average};
pub use bound::{joint_tail, largest_odds, two_sided_tail};
pub use consistency::{Consistency, Fitted, consistency};
pub use look_elsewhere::{GlobalTail, correlations, global_tail};
pub use odds::{Odds, odds};
pub use tested::{LEAST_DISTANCE, distance_from_prior};
pub use width::{DECISIVE_FACTOR, Turning, Verdict, WidthCurve, width_curve};
