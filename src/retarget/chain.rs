//! Turns along a chain, spread over another one with more or fewer joints.

use crate::rotor::{Rotor, slerp};

/// The turns along a chain at `knots` of another one.
///
/// `turns` are cumulative: how each joint of the chain is turned against what the chain hangs on, rest removed. `from` are the
/// ends of their bones as shares of the chain's length, rising to 1; between them turns follow slerp, and before the first
/// from no turn. The last knot, 1, has exactly the last turn.
///
/// Source: the methods page, section 20.3 (cumulative turns at arc-length knots).
///
/// # Panics
/// When `turns` and `from` differ in length.
pub fn spread(turns: &[Rotor], from: &[f64], knots: &[f64]) -> Vec<Rotor> {
    assert_eq!(turns.len(), from.len(), "a knot for each turn");
    knots
        .iter()
        .map(|&at| {
            let above = from.iter().position(|&knot| knot >= at).unwrap_or(turns.len().saturating_sub(1));
            let Some(&end) = turns.get(above) else { return Rotor::IDENTITY };
            let (start, low) = match above.checked_sub(1) {
                Some(before) => (turns[before], from[before]),
                None => (Rotor::IDENTITY, 0.0),
            };
            let width = from[above] - low;
            let share = if width > 0.0 { ((at - low) / width).clamp(0.0, 1.0) } else { 1.0 };
            if share >= 1.0 { end } else { slerp(start, end, share) }
        })
        .collect()
}
