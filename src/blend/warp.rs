//! Dynamic time warping: the cheapest way through a grid of distances, in step with both clips.

/// The way through the grid and what it costs.
#[derive(Clone, Debug, PartialEq)]
pub struct WarpPath {
    /// Row and column of each cell, from the first to the last of both.
    pub cells: Vec<(usize, usize)>,
    /// The sum of the distances of all cells on it.
    pub total: f64,
}

/// The cells of each row that may be stepped on: `first..end`.
pub(super) type Band = Vec<(usize, usize)>;

/// A band about the straight diagonal, `share` of the columns to either side, at least `least` cells.
pub(super) fn diagonal_band(rows: usize, columns: usize, share: f64, least: usize) -> Band {
    let half = (share * columns as f64).max(least as f64);
    let slope = if rows > 1 { (columns - 1) as f64 / (rows - 1) as f64 } else { 0.0 };
    (0..rows)
        .map(|row| {
            let middle = row as f64 * slope;
            let reach = half.max(slope + 1.0);
            let first = (middle - reach).ceil().max(0.0) as usize;
            let end = ((middle + reach).floor() as usize + 1).min(columns);
            if rows == 1 { (0, columns) } else { (first.min(columns - 1), end) }
        })
        .collect()
}

/// The cheapest way from the first cell to the last of a grid of `rows` × `columns` distances, with steps down, right and both at once
/// (Sakoe & Chiba 1978). `most_straight` bounds how many steps down, or right, may follow each other (Kovar & Gleicher
/// 2003): the pace of one clip is at most `most_straight + 1` times the other's. `share` bounds how far the way leaves the
/// diagonal, as a share of the columns to either side; 1 for no bound.
///
/// `None` when the grid is empty or no way keeps the bounds. Takes memory for the cells within the band: one byte each for
/// each kind of step.
pub fn time_warp(
    rows: usize,
    columns: usize,
    most_straight: Option<usize>,
    share: f64,
    distance: impl FnMut(usize, usize) -> f64,
) -> Option<WarpPath> {
    if rows == 0 || columns == 0 {
        return None;
    }
    warp_within(&diagonal_band(rows, columns, share, 2), columns, most_straight, distance)
}

/// How a cell was entered: both at once, or so many steps down or right in a row.
const START: u8 = u8::MAX;

/// As [`time_warp`], within any band.
pub(super) fn warp_within(
    band: &[(usize, usize)],
    columns: usize,
    most_straight: Option<usize>,
    mut distance: impl FnMut(usize, usize) -> f64,
) -> Option<WarpPath> {
    // Without a bound one state for each of the three steps serves: the count of a run then never matters.
    let runs = most_straight.unwrap_or(1).clamp(1, 60);
    let is_bounded = most_straight.is_some();
    // State 0: entered by both; 1..=runs: that many steps right in a row; runs+1..=2·runs: that many down.
    let states = 2 * runs + 1;
    let down = |run: usize| runs + run;
    let rows = band.len();
    let mut from: Vec<Vec<u8>> = Vec::with_capacity(rows);
    let mut above: Vec<f64> = Vec::new();
    for (row, &(first, end)) in band.iter().enumerate() {
        let mut costs = vec![f64::INFINITY; (end - first) * states];
        let mut came = vec![START; (end - first) * states];
        let (above_first, above_end) = if row > 0 { band[row - 1] } else { (0, 0) };
        for column in first..end {
            let here = (column - first) * states;
            let own = distance(row, column);
            let (before, rest) = costs.split_at_mut(here);
            let (own_costs, own_came) = (&mut rest[..states], &mut came[here..][..states]);
            if row == 0 && column == 0 {
                own_costs[0] = own;
                continue;
            }
            // The best state of a cell, by which every step may leave it, and the best that still may go on straight.
            let mut put = |state: usize, (cost, origin): (f64, usize)| {
                if cost + own < own_costs[state] {
                    own_costs[state] = cost + own;
                    own_came[state] = origin as u8;
                }
            };
            if row > 0 && column > 0 && (above_first..above_end).contains(&(column - 1)) {
                let cell = &above[(column - 1 - above_first) * states..][..states];
                put(0, best(cell, 0..states));
            }
            if column > first {
                let cell = &before[here - states..];
                // A first step right after anything but a step right.
                put(1, best(cell, std::iter::once(0).chain(down(1)..states)));
                if is_bounded {
                    for run in 2..=runs {
                        put(run, (cell[run - 1], run - 1));
                    }
                } else {
                    put(1, (cell[1], 1));
                }
            }
            if row > 0 && (above_first..above_end).contains(&column) {
                let cell = &above[(column - above_first) * states..][..states];
                put(down(1), best(cell, 0..=runs));
                if is_bounded {
                    for run in 2..=runs {
                        put(down(run), (cell[down(run - 1)], down(run - 1)));
                    }
                } else {
                    put(down(1), (cell[down(1)], down(1)));
                }
            }
        }
        from.push(came);
        above = costs;
    }
    let (first, end) = band[rows - 1];
    if end != columns {
        return None;
    }
    let (total, mut state) = best(&above[(columns - 1 - first) * states..][..states], 0..states);
    if !total.is_finite() {
        return None;
    }
    let (mut row, mut column) = (rows - 1, columns - 1);
    let mut cells = vec![(row, column)];
    loop {
        let origin = from[row][(column - band[row].0) * states + state];
        if origin == START {
            break;
        }
        if state == 0 {
            (row, column) = (row - 1, column - 1);
        } else if state <= runs {
            column -= 1;
        } else {
            row -= 1;
        }
        state = usize::from(origin);
        cells.push((row, column));
    }
    cells.reverse();
    Some(WarpPath { cells, total })
}

/// The least of some states, and which.
fn best(cell: &[f64], states: impl IntoIterator<Item = usize>) -> (f64, usize) {
    states
        .into_iter()
        .map(|state| (cell[state], state))
        .fold((f64::INFINITY, 0), |least, one| if one.0 < least.0 { one } else { least })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn worked_example() {
        // reference/method_checks.json `dtw`.
        let a = [0.0, 1.0, 2.0, 3.0, 4.0, 3.0, 2.0, 1.0, 0.0_f64];
        let b = [0.0, 0.0, 1.0, 2.0, 4.0, 4.0, 3.0, 1.0, 0.0, 0.0];
        let path = time_warp(a.len(), b.len(), None, 1.0, |i, j| (a[i] - b[j]).abs()).unwrap();
        assert_eq!(path.total, 2.0);
        assert_eq!((path.cells[0], *path.cells.last().unwrap()), ((0, 0), (8, 9)));
        let sum: f64 = path.cells.iter().map(|&(i, j)| (a[i] - b[j]).abs()).sum();
        assert_eq!(sum, path.total);
    }

    /// Every way through the grid, tried out.
    fn by_trying(
        rows: usize,
        columns: usize,
        most: usize,
        at: (usize, usize),
        run: (u8, usize),
        distance: &dyn Fn(usize, usize) -> f64,
    ) -> f64 {
        let own = distance(at.0, at.1);
        if at == (rows - 1, columns - 1) {
            return own;
        }
        let mut least = f64::INFINITY;
        for (kind, (down, right)) in [(0_u8, (1, 1)), (1, (0, 1)), (2, (1, 0))] {
            let next = (at.0 + down, at.1 + right);
            let length = if kind != 0 && kind == run.0 { run.1 + 1 } else { 1 };
            if next.0 < rows && next.1 < columns && (kind == 0 || length <= most) {
                least = least.min(by_trying(rows, columns, most, next, (kind, length), distance));
            }
        }
        own + least
    }

    #[test]
    fn the_cheapest_of_all_ways_that_keep_the_bound() {
        let distance = |i: usize, j: usize| ((i * 7 + j * 13 + i * j * 5) % 11) as f64;
        for (rows, columns, most) in [(5, 5, 1), (5, 6, 2), (4, 7, 2), (7, 5, 3), (6, 6, 2), (1, 3, 2)] {
            let expected = by_trying(rows, columns, most, (0, 0), (0, 0), &distance);
            let found = time_warp(rows, columns, Some(most), 1.0, distance);
            assert_eq!(found.map_or(f64::INFINITY, |path| path.total), expected, "{rows}x{columns} {most}");
        }
        // 3 rows can't be in step with 20 columns at two straight steps in a row.
        assert!(time_warp(3, 20, Some(2), 1.0, distance).is_none());
    }
}
