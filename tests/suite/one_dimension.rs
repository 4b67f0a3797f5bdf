//! A worked example on a line: which landmarks did the vehicle pass?
//!
//! Six look-alike landmarks stand on a straight line. At each of three steps the vehicle is exactly over one of
//! them; between the steps it moves by known amounts, each within a bound. Two ways to find out where it was:
//!
//! * *Discrete*: each step has a set of landmarks it may be at. Sweeping forward and backward, a landmark is struck
//!   out when no landmark of the neighbouring step is one move away (arc consistency).
//! * *Intervals*: each step has one interval of positions. Sweeping forward and backward, it is cut to what the
//!   neighbour's interval and the move allow, then to the hull of the landmarks left inside.
//!
//! A hull also holds what lies between two candidates, so each sweep of intervals removes less, and more sweeps are
//! needed; here the answer is the same. The numbers were found by random search for such a case and are checked
//! below against all 6³ triples.

use fixability::interval::Interval;

/// Places of the landmarks, metres along the line.
const LANDMARKS_M: [f64; 6] = [4.0, 32.0, 56.0, 85.0, 119.0, 138.0];

/// The two moves as reported, metres.
const MOVES_M: [f64; 2] = [-34.25, 53.0];

/// Bound on the error of a move, metres.
const MOVE_ERROR_M: f64 = 2.5;

/// Where the vehicle truly was: numbers of the landmarks. The true moves are −34 m and 53 m.
const TRUTH: [usize; 3] = [4, 3, 5];

/// Links between steps in the order of one sweep: from, to, sign of the move, which move.
const SWEEP: [(usize, usize, f64, usize); 4] =
    [(0, 1, 1.0, 0), (1, 2, 1.0, 1), (2, 1, -1.0, 1), (1, 0, -1.0, 0)];

fn move_fits(from: usize, to: usize, which: usize) -> bool {
    (LANDMARKS_M[to] - LANDMARKS_M[from] - MOVES_M[which]).abs() <= MOVE_ERROR_M
}

/// All triples of landmarks whose separations fit the moves.
fn consistent_triples() -> Vec<[usize; 3]> {
    let mut found = Vec::new();
    for a in 0..6 {
        for b in 0..6 {
            for c in 0..6 {
                if move_fits(a, b, 0) && move_fits(b, c, 1) {
                    found.push([a, b, c]);
                }
            }
        }
    }
    found
}

/// Repeats `sweep` until nothing changes; how many sweeps changed something, and the end.
fn to_fixed_point<T: Clone + PartialEq>(mut state: T, sweep: impl Fn(&mut T)) -> (usize, T) {
    for sweeps in 0.. {
        let before = state.clone();
        sweep(&mut state);
        if state == before {
            return (sweeps, state);
        }
    }
    unreachable!("the sweeps only ever shrink a finite set")
}

fn discrete() -> (usize, [Vec<usize>; 3]) {
    to_fixed_point([(); 3].map(|()| (0..6).collect::<Vec<usize>>()), |domains| {
        for (from, to, sign, which) in SWEEP {
            let neighbours = domains[from].clone();
            domains[to].retain(|&here| {
                neighbours.iter().any(|&there| {
                    if sign > 0.0 { move_fits(there, here, which) } else { move_fits(here, there, which) }
                })
            });
        }
    })
}

/// Hull of the landmarks inside `positions`.
fn hull_of_landmarks(positions: Interval) -> Interval {
    let left = LANDMARKS_M.iter().filter(|place| positions.contains(**place));
    left.fold(Interval::EMPTY, |hull, place| hull.hull(Interval::point(*place)))
}

fn interval_sweep(positions: &mut [Interval; 3]) {
    for (from, to, sign, which) in SWEEP {
        let travel = Interval::around(sign * MOVES_M[which], MOVE_ERROR_M);
        positions[to] = hull_of_landmarks(positions[to].intersection(positions[from] + travel));
    }
}

fn intervals() -> (usize, [Interval; 3]) {
    to_fixed_point([hull_of_landmarks(Interval::ENTIRE); 3], interval_sweep)
}

#[test]
fn exactly_one_triple_is_consistent() {
    assert_eq!(consistent_triples(), [TRUTH]);
}

#[test]
fn discrete_sweeps_leave_the_one_triple() {
    let (sweeps, domains) = discrete();
    assert_eq!(domains, TRUTH.map(|landmark| vec![landmark]));
    assert_eq!(sweeps, 1);
}

#[test]
fn interval_sweeps_reach_the_same_answer_and_need_more_of_them() {
    let (sweeps, positions) = intervals();
    assert_eq!(positions, TRUTH.map(|landmark| Interval::point(LANDMARKS_M[landmark])));
    assert_eq!(sweeps, 4);
    assert!(sweeps > discrete().0);
}

#[test]
fn one_interval_sweep_keeps_the_triple_among_others() {
    let mut positions = [hull_of_landmarks(Interval::ENTIRE); 3];
    interval_sweep(&mut positions);
    let held = positions.map(|p| LANDMARKS_M.iter().filter(|place| p.contains(**place)).count());
    assert_eq!(held, [3, 4, 4]);
    for (step, landmark) in TRUTH.into_iter().enumerate() {
        assert!(positions[step].contains(LANDMARKS_M[landmark]));
    }
}
