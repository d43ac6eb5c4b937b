//! Pure mathematics on `f64`: no graph, no places, no clock.
//!
//! Every function gives the same bits on every machine: elementary functions come from [`elementary`], sums and
//! matrix products run in a fixed order, and nothing uses a fused multiply-add.
//!
//! | module | what it holds |
//! |---|---|
//! | [`elementary`] | exp, ln, sin, … the only ones the project calls |
//! | [`sum`] | ordered compensated sums, mean, experimental and pooled variance |
//! | [`linear`] | small dense matrices: products, Cholesky factor, symmetric solution |
//! | [`least_squares`] | linear fits by [`householder`] reflections, with their response to data and design |
//! | [`tall`] | the same block by block, for very many rows |
//! | [`interpolate`] | weights of piecewise linear interpolation |
//! | [`root`] | roots of monotone functions |
//! | [`continued_fraction`] | evaluation of continued fractions |
//! | [`gamma`], [`beta`] | incomplete gamma and beta functions, and the gamma quantile |
//! | [`normal`], [`student_t`] | the two distributions behind coverage factors |
//! | [`distribution`] | the probabilities and quantiles the rest of the project asks for |
//! | [`sampler`] | from a uniform draw to a draw of each input distribution |
//! | [`tabulated`] | slow quantiles as piecewise polynomials in the normal one |
//! | `chacha` | the key stream behind the random streams |
//! | [`astronomy`] | places of Moon and Sun, orientation of the Earth, tidal arguments |
//! | `wide` | loops for the processor's widest registers, with the same bits |
//! | [`stream`] | reproducible random streams, one per input and block of trials |

pub mod astronomy;
pub mod beta;
mod chacha;
pub mod continued_fraction;
pub mod distribution;
pub mod elementary;
pub mod gamma;
pub mod householder;
pub mod interpolate;
pub mod least_squares;
pub mod linear;
pub mod normal;
pub mod root;
pub mod sampler;
pub mod stream;
pub mod student_t;
pub mod sum;
pub mod tabulated;
pub mod tall;
pub(crate) mod wide;
