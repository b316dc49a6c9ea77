/// Where a position in space stands in a state when nothing is said: its first three components.
pub(super) fn default_position() -> [usize; 3] {
    [0, 1, 2]
}
