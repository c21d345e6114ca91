//! Teasel's drawings over any plotters backend: the same code on the page's canvas and in SVG.
