//! All checks; each room of the house has its module.

mod contrast;
mod describe;
mod dimensions;
mod kinds;
mod large;
mod places;
mod prepare;
mod quality;
mod readers;
mod rejection;
mod steady;
mod takeaway;
