//! All checks; each room of the house has its module.

mod describe;
mod prepare;
mod takeaway;
