//! Where a position stands in a state when nothing is said: its first components.

/// Of a position in the plane.
pub(super) fn first_two() -> [usize; 2] {
    [0, 1]
}

/// Of a position in space.
pub(super) fn first_three() -> [usize; 3] {
    [0, 1, 2]
}
