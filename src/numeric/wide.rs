//! Loops compiled for the processor's widest registers, chosen when the program runs.
//!
//! Wider registers change how many numbers an instruction holds, never how each is rounded: no fused multiply-add is
//! enabled, and sums keep their written order. So the bits are the same on every machine.

/// Calls a function marked `#[inline(always)]` in the widest form that the processor has.
macro_rules! widest {
    ($function:ident($($argument:expr),* $(,)?)) => {{
        #[cfg(target_arch = "x86_64")]
        {
            if std::is_x86_feature_detected!("avx512f") {
                // SAFETY: the feature was detected just above.
                return unsafe { crate::numeric::wide::with_avx512(|| $function($($argument),*)) };
            }
            if std::is_x86_feature_detected!("avx2") {
                // SAFETY: the feature was detected just above.
                return unsafe { crate::numeric::wide::with_avx2(|| $function($($argument),*)) };
            }
        }
        $function($($argument),*)
    }};
}

pub(crate) use widest;

/// Runs a closure compiled for 512-bit registers.
///
/// # Safety
/// The processor must have AVX-512F.
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f")]
pub(crate) unsafe fn with_avx512<T>(work: impl FnOnce() -> T) -> T {
    work()
}

/// Runs a closure compiled for 256-bit registers.
///
/// # Safety
/// The processor must have AVX2.
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
pub(crate) unsafe fn with_avx2<T>(work: impl FnOnce() -> T) -> T {
    work()
}
