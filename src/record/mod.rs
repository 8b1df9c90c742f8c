//! What leaves the house.
