//! Loops compiled for the processor's widest registers, chosen when the program runs.
//!
//! Wider registers change how many numbers an instruction holds, never how each is rounded: no fused multiply-add is
//! enabled, and sums keep their written order. So the bits are the same on every machine.

/// Calls a function marked `#[inline(always)]` in the widest form that the processor has.
///
/// The arguments are written with their types, because each form is a function of its own: what it calls is compiled
/// for wider registers only where it becomes part of it, closures and generic functions included.
macro_rules! widest {
    ($function:ident($($argument:ident: $type:ty),* $(,)?)) => {{
        #[cfg(target_arch = "x86_64")]
        {
            #[target_feature(enable = "avx512f")]
            fn with_avx512($($argument: $type),*) {
                $function($($argument),*);
            }
            #[target_feature(enable = "avx2")]
            fn with_avx2($($argument: $type),*) {
                $function($($argument),*);
            }
            if std::is_x86_feature_detected!("avx512f") {
                // SAFETY: the feature was detected just above.
                return unsafe { with_avx512($($argument),*) };
            }
            if std::is_x86_feature_detected!("avx2") {
                // SAFETY: the feature was detected just above.
                return unsafe { with_avx2($($argument),*) };
            }
        }
        $function($($argument),*)
    }};
}

pub(crate) use widest;
