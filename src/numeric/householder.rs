//! Orthogonal triangular form of a tall matrix by reflections, columns in their given order.
//!
//! # Source
//! A. S. Householder, J. ACM 5 (1958) 339-342; G. H. Golub, Numer. Math. 7 (1965) 206-216.

use super::elementary::sqrt;

/// A = Q R with the columns of A scaled by powers of two: A D = Q R.
#[derive(Debug, Clone)]
pub struct Triangular {
    /// Unit reflection vectors; the j-th has zeros above row j.
    reflectors: Vec<Vec<f64>>,
    /// R by columns: the j-th has j + 1 elements.
    columns: Vec<Vec<f64>>,
    /// D: each a power of two, so that scaling rounds nothing.
    scales: Vec<f64>,
}

/// Index of the first column that the columns before it determine to within rounding.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Dependent(pub usize);

impl Triangular {
    /// Decomposes the matrix with these columns, all of one length not less than their number.
    pub fn new(columns: Vec<Vec<f64>>) -> Result<Self, Dependent> {
        let mut made = Self { reflectors: Vec::new(), columns: Vec::new(), scales: Vec::new() };
        for column in columns {
            made.append(column)?;
        }
        Ok(made)
    }

    /// The same for a block of a taller matrix, whose columns may depend on each other within it.
    pub fn without_check(columns: Vec<Vec<f64>>) -> Self {
        let mut made = Self { reflectors: Vec::new(), columns: Vec::new(), scales: Vec::new() };
        let mut left = columns;
        let scales: Vec<f64> = left.iter_mut().map(|column| scale(column)).collect();
        left.reverse();
        for (index, scale) in scales.into_iter().enumerate() {
            let Some(column) = left.pop() else { break };
            made.reflect_column(column, scale);
            reflect_all(&made.reflectors[index], index, &mut left);
        }
        made
    }

    /// Column j of the triangle of the matrix as given, with its zeros, `height` long.
    pub fn unscaled_column(&self, j: usize, height: usize) -> Vec<f64> {
        let (column, scale) = (&self.columns[j], self.scales[j]);
        (0..height).map(|i| column.get(i).map_or(0.0, |entry| entry / scale)).collect()
    }

    /// Reflects one more column by those before it, then makes its own reflection.
    fn append(&mut self, mut column: Vec<f64>) -> Result<(), Dependent> {
        let (index, rows) = (self.columns.len(), column.len());
        let (scale, norm) = self.prepare(&mut column);
        let remaining = length(column.get(index..).unwrap_or(&[]));
        let threshold = f64::EPSILON * (rows + 10 * (index + 1)) as f64;
        // Entries that are no numbers fail this comparison and count as dependent.
        let independent = remaining > norm * threshold;
        if !independent {
            return Err(Dependent(index));
        }
        self.reflect_column(column, scale);
        Ok(())
    }

    /// Scales a column and reflects it by those before it; its scale, and its length when scaled.
    fn prepare(&self, column: &mut [f64]) -> (f64, f64) {
        let scale = scale(column);
        let norm = length(column);
        self.apply_transposed(column);
        (scale, norm)
    }

    /// Makes the reflection of a prepared column.
    fn reflect_column(&mut self, mut column: Vec<f64>, scale: f64) {
        let index = self.columns.len();
        let tail = column.get(index..).unwrap_or(&[]);
        let remaining = length(tail);
        // The sign that adds, so that no digits cancel.
        let diagonal = if tail.first().is_some_and(|first| *first > 0.0) { -remaining } else { remaining };
        let mut reflector = vec![0.0; index];
        reflector.extend_from_slice(tail);
        if let Some(first) = reflector.get_mut(index) {
            *first -= diagonal;
        }
        let reflector_length = length(&reflector);
        if reflector_length > 0.0 {
            reflector.iter_mut().for_each(|x| *x /= reflector_length);
        }
        column.truncate(index);
        column.push(diagonal);
        self.reflectors.push(reflector);
        self.columns.push(column);
        self.scales.push(scale);
    }

    /// Q' v in place.
    pub fn apply_transposed(&self, vector: &mut [f64]) {
        self.reflectors.iter().enumerate().for_each(|(start, reflector)| reflect(reflector, start, vector));
    }

    /// The first columns of Q, as many as A has.
    pub fn orthonormal_columns(&self, rows: usize) -> Vec<Vec<f64>> {
        let unit = |j: usize| {
            let mut column = vec![0.0; rows];
            column.iter_mut().skip(j).take(1).for_each(|x| *x = 1.0);
            column
        };
        let mut columns: Vec<Vec<f64>> = (0..self.columns.len()).map(unit).collect();
        for (k, reflector) in self.reflectors.iter().enumerate().rev() {
            // Reflections after the j-th leave the j-th unit vector alone.
            reflect_all(reflector, k, &mut columns[k..]);
        }
        columns
    }

    /// D R^-1 b: coefficients of the columns of A as given, from the first elements of Q' y.
    pub fn solve(&self, b: &[f64]) -> Vec<f64> {
        let mut x: Vec<f64> = b.iter().take(self.columns.len()).copied().collect();
        for (j, column) in self.columns.iter().enumerate().rev() {
            let (Some(value), Some(diagonal)) = (x.get(j), column.last()) else { continue };
            let value = value / diagonal;
            x.iter_mut().zip(column).take(j).for_each(|(x, r)| *x -= r * value);
            x.iter_mut().skip(j).take(1).for_each(|x| *x = value);
        }
        x.iter().zip(&self.scales).map(|(x, scale)| x * scale).collect()
    }

    /// [`Triangular::solve`] for every row of these columns at once; the digits are the same.
    pub fn solve_rows(&self, mut columns: Vec<Vec<f64>>) -> Vec<Vec<f64>> {
        for (j, column) in self.columns.iter().enumerate().rev() {
            let count = columns.len();
            let (before, rest) = columns.split_at_mut(j.min(count));
            let (Some(values), Some(diagonal)) = (rest.first_mut(), column.last()) else { continue };
            values.iter_mut().for_each(|value| *value /= diagonal);
            for (entries, r) in before.iter_mut().zip(column) {
                entries.iter_mut().zip(values.iter()).for_each(|(x, value)| *x -= r * value);
            }
        }
        for (column, scale) in columns.iter_mut().zip(&self.scales) {
            column.iter_mut().for_each(|x| *x *= scale);
        }
        columns
    }
}

/// v - 2 r (r . v), from row `start` on.
fn reflect(reflector: &[f64], start: usize, vector: &mut [f64]) {
    let pairs = || reflector.iter().skip(start);
    let twice = 2.0 * pairs().zip(vector.iter().skip(start)).map(|(r, v)| r * v).fold(0.0, |sum, term| sum + term);
    vector.iter_mut().skip(start).zip(pairs()).for_each(|(v, r)| *v -= twice * r);
}

/// [`reflect`] of several vectors, four side by side: each sum waits for its last term, and four wait together. The
/// digits are the same.
fn reflect_all(reflector: &[f64], start: usize, vectors: &mut [Vec<f64>]) {
    let (fours, rest) = vectors.as_chunks_mut::<4>();
    for four in fours {
        let [a, b, c, d] = four.each_mut().map(|vector| vector.get_mut(start..).unwrap_or_default());
        let r = reflector.get(start..).unwrap_or_default();
        let mut sums = [0.0; 4];
        for ((((r, a), b), c), d) in r.iter().zip(a.iter()).zip(b.iter()).zip(c.iter()).zip(d.iter()) {
            sums[0] += r * a;
            sums[1] += r * b;
            sums[2] += r * c;
            sums[3] += r * d;
        }
        for (vector, sum) in [a, b, c, d].into_iter().zip(sums) {
            let twice = 2.0 * sum;
            vector.iter_mut().zip(r).for_each(|(v, r)| *v -= twice * r);
        }
    }
    rest.iter_mut().for_each(|vector| reflect(reflector, start, vector));
}

/// Scales a column by a power of two so that its largest entry is between 1 and 2; the power.
fn scale(column: &mut [f64]) -> f64 {
    let scale = power_of_two_below(column.iter().fold(0.0, |largest: f64, x| largest.max(x.abs())));
    column.iter_mut().for_each(|x| *x *= scale);
    scale
}

/// Euclidean length; the entries are scaled beforehand so that no square overflows.
fn length(vector: &[f64]) -> f64 {
    sqrt(vector.iter().fold(0.0, |sum, x| sum + x * x))
}

/// 2^-k with x 2^-k between 1 and 2 for a normal x, else 1.
fn power_of_two_below(x: f64) -> f64 {
    if !x.is_normal() || x > 1e300 {
        return 1.0;
    }
    1.0 / f64::from_bits(x.to_bits() & 0x7ff0_0000_0000_0000)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn scales_are_powers_of_two() {
        assert_eq!([1.0, 3.5, 0.3, 0.0, f64::INFINITY].map(power_of_two_below), [1.0, 0.5, 4.0, 1.0, 1.0]);
    }

    #[test]
    fn a_dependent_column_is_named() {
        let columns = vec![vec![1.0, 1.0, 1.0], vec![1.0, 2.0, 3.0], vec![3.0, 5.0, 7.0]];
        assert_eq!(Triangular::new(columns).unwrap_err(), Dependent(2));
        assert_eq!(Triangular::new(vec![vec![0.0; 3]]).unwrap_err(), Dependent(0));
        assert_eq!(Triangular::new(vec![vec![f64::NAN; 3]]).unwrap_err(), Dependent(0));
    }

    proptest! {
        #[test]
        fn columns_are_orthonormal(entries in prop::collection::vec(-1.0f64..1.0, 24)) {
            let columns: Vec<Vec<f64>> = entries.chunks(8).map(<[f64]>::to_vec).collect();
            let q = Triangular::new(columns).unwrap().orthonormal_columns(8);
            for i in 0..3 {
                for j in 0..3 {
                    let product: f64 = q[i].iter().zip(&q[j]).map(|(x, y)| x * y).sum();
                    prop_assert!((product - f64::from(u8::from(i == j))).abs() < 1e-14);
                }
            }
        }
    }
}
