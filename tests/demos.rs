//! Every sample of `shapes/` is solved and compared with the hand value that stands in its comment.
