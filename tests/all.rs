//! All checks; each room of the house has its module.

mod contrast;
mod describe;
mod many;
mod movies;
mod prepare;
mod readers;
mod takeaway;
