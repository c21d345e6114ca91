//! The thin layer between the browser and Teasel's core.
