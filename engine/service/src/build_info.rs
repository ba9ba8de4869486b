//! Which engine this is.

use ropewalk_api::ropewalk::v1;

/// Version, contract, and the instructions that the linear algebra uses on this machine.
#[must_use]
pub fn engine_build() -> v1::EngineBuild {
    v1::EngineBuild {
        version: env!("CARGO_PKG_VERSION").to_owned(),
        contract: "ropewalk.v1".to_owned(),
        instruction_set: instruction_set(),
    }
}

/// The processor architecture and the vector instructions in use.
///
/// The linear algebra chooses at run time, by the same features, between its code for AVX2 with FMA and plain code;
/// code for AVX-512 is not built in.
fn instruction_set() -> String {
    format!("{} {}", std::env::consts::ARCH, vector_instructions())
}

#[cfg(any(target_arch = "x86", target_arch = "x86_64"))]
fn vector_instructions() -> &'static str {
    let wide = is_x86_feature_detected!("sse4.2")
        && is_x86_feature_detected!("popcnt")
        && is_x86_feature_detected!("avx")
        && is_x86_feature_detected!("avx2")
        && is_x86_feature_detected!("bmi1")
        && is_x86_feature_detected!("bmi2")
        && is_x86_feature_detected!("fma")
        && is_x86_feature_detected!("lzcnt");
    if wide { "avx2+fma" } else { "baseline" }
}

#[cfg(target_arch = "aarch64")]
fn vector_instructions() -> &'static str {
    if std::arch::is_aarch64_feature_detected!("neon") {
        "neon"
    } else {
        "baseline"
    }
}

#[cfg(not(any(target_arch = "x86", target_arch = "x86_64", target_arch = "aarch64")))]
fn vector_instructions() -> &'static str {
    "baseline"
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_instruction_set_names_the_architecture() {
        assert!(engine_build().instruction_set.starts_with(std::env::consts::ARCH));
    }
}
