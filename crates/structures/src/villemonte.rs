//! A drowned weir passes a share of its free flow.

/// The share of its free flow that a weir passes with tail water above its crest.
///
/// `submergence` is the tail head over the upstream head, both above the crest: 0 or below gives 1,
/// 1 or above gives 0 (the law does not say what flows back). `exponent` is that of the free law:
/// 1.5 rectangular, 2.5 for a V-notch. Meant for thin-plate weirs; for broad crests it applies
/// only above the modular limit, rescaled from there (common practice).
///
/// **Source**: J. R. Villemonte (1947), "Submerged-weir discharge studies", Engineering
/// News-Record 139, 866-869: Q/Q1 = (1 - S^n)^0.385.
pub fn drowned_share(submergence: f64, exponent: f64) -> f64 {
    let s = submergence.clamp(0.0, 1.0);
    libm::pow(1.0 - libm::pow(s, exponent), 0.385)
}
