//! Losses in the string's material and at its ends.

use core::f64::consts::{PI, TAU};

use crate::bounds::{self, Bound};
use crate::error::Result;
use crate::loss::Loss;
use crate::string::StringSpec;

/// The same share of energy lost per radian in every mode: σ = η ω/2. Friction
/// in the material and between windings is often put this way.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct LossFactor(f64);

impl LossFactor {
    /// η = 1/Q.
    ///
    /// # Errors
    /// A value outside [`bounds::LOSS_FACTOR`].
    pub fn new(loss_factor: f64) -> Result<Self> {
        bounds::LOSS_FACTOR.check(loss_factor).map(Self)
    }
}

impl Loss for LossFactor {
    fn decay_rate_per_s(&self, _: u32, frequency_hz: f64, _: &StringSpec) -> f64 {
        0.5 * self.0 * TAU * frequency_hz
    }
}

/// Share of a mode's elastic energy that is in bending: B n²/(1 + B n²), with
/// the half waves of clamped ends taken as n.
fn bending_share(n: u32, string: &StringSpec) -> f64 {
    let stiffness = string.inharmonicity() * f64::from(n) * f64::from(n);
    stiffness / (1.0 + stiffness)
}

/// Loss of the material in bending: a complex modulus E (1 + i η_E) gives
/// η_n = η_E B n²/(1 + B n²) (Woodhouse, Euphonics, section 5.4.4).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct BendingLoss(f64);

impl BendingLoss {
    /// η_E of the material.
    ///
    /// # Errors
    /// A value outside [`bounds::LOSS_FACTOR`].
    pub fn new(loss_factor: f64) -> Result<Self> {
        bounds::LOSS_FACTOR.check(loss_factor).map(Self)
    }
}

impl Loss for BendingLoss {
    fn decay_rate_per_s(&self, n: u32, frequency_hz: f64, string: &StringSpec) -> f64 {
        0.5 * self.0 * bending_share(n, string) * TAU * frequency_hz
    }
}

/// First zero of the derivative of the Bessel function J₁.
const BESSEL_ZERO: f64 = 1.841_183_781_340_659;
/// Weight of that term: 8/(q² (q² − 1)); all others together have 1.3 %.
const WEIGHT: f64 = 8.0 / (BESSEL_ZERO * BESSEL_ZERO * (BESSEL_ZERO * BESSEL_ZERO - 1.0));

const fn thermal(name: &'static str, unit: &'static str, min: f64, max: f64) -> Bound {
    Bound {
        name,
        unit,
        min,
        max,
    }
}

const EXPANSION: Bound = thermal("thermal expansion", "1/K", 0.0, 1.0e-3);
const TEMPERATURE: Bound = thermal("temperature", "K", 100.0, 1_000.0);
const HEAT_CAPACITY: Bound = thermal("specific heat capacity", "J/(kg·K)", 1.0, 1.0e5);
const CONDUCTIVITY: Bound = thermal("heat conductivity", "W/(m·K)", 1.0e-3, 1.0e5);

/// Thermal data of the material of a round wire.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct WireThermal {
    /// Linear thermal expansion in 1/K.
    pub expansion_per_k: f64,
    /// Absolute temperature in K.
    pub temperature_k: f64,
    /// Specific heat capacity in J/(kg·K).
    pub heat_capacity_j_per_kg_k: f64,
    /// Heat conductivity in W/(m·K).
    pub conductivity_w_per_m_k: f64,
}

impl WireThermal {
    /// Music wire (steel) at 20 °C (makeitfrom.com, ASTM A228).
    pub const STEEL: Self = Self {
        expansion_per_k: 12.0e-6,
        temperature_k: 293.15,
        heat_capacity_j_per_kg_k: 470.0,
        conductivity_w_per_m_k: 49.0,
    };
}

/// Loss by heat that flows across a bent wire and back (Zener 1937; from
/// memory): η_E(ω) = w Δ ω τ/(1 + ω² τ²) in bending, with Δ = E α² T/(ρ c),
/// τ = d²/(4 q² χ), χ = k/(ρ c), q the first zero of J₁′ and w its weight.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct ThermoelasticLoss {
    strength: f64,
    relaxation_s: f64,
}

impl ThermoelasticLoss {
    /// The loss of a wire of `diameter_m`, density and modulus of its material.
    ///
    /// # Errors
    /// A value outside [`bounds::DIAMETER_M`], [`bounds::DENSITY`],
    /// [`bounds::YOUNGS_MODULUS`] or the range of its thermal quantity.
    pub fn new(
        diameter_m: f64,
        density_kg_per_m3: f64,
        youngs_modulus_pa: f64,
        thermal: &WireThermal,
    ) -> Result<Self> {
        let diameter = bounds::DIAMETER_M.check(diameter_m)?;
        let density = bounds::DENSITY.check(density_kg_per_m3)?;
        let modulus = bounds::YOUNGS_MODULUS.check(youngs_modulus_pa)?;
        let expansion = EXPANSION.check(thermal.expansion_per_k)?;
        let temperature = TEMPERATURE.check(thermal.temperature_k)?;
        let heat = density * HEAT_CAPACITY.check(thermal.heat_capacity_j_per_kg_k)?;
        let diffusivity = CONDUCTIVITY.check(thermal.conductivity_w_per_m_k)? / heat;
        let across = diameter / (2.0 * BESSEL_ZERO);
        Ok(Self {
            strength: WEIGHT * modulus * expansion * expansion * temperature / heat,
            relaxation_s: across * across / diffusivity,
        })
    }

    /// η_E at `frequency_hz`.
    #[must_use]
    pub fn loss_factor(&self, frequency_hz: f64) -> f64 {
        let x = TAU * frequency_hz * self.relaxation_s;
        self.strength * x / (1.0 + x * x)
    }

    /// Where the loss factor peaks, in Hz.
    #[must_use]
    pub fn peak_hz(&self) -> f64 {
        1.0 / (TAU * self.relaxation_s)
    }
}

impl Loss for ThermoelasticLoss {
    fn decay_rate_per_s(&self, n: u32, frequency_hz: f64, string: &StringSpec) -> f64 {
        self.loss_factor(frequency_hz) * bending_share(n, string) * PI * frequency_hz
    }
}

/// Loss through an end that gives way: σ = (T/L) Re Y for an admittance Y
/// (velocity over force) well below 1/Z₀ (first order; the tests compare it with
/// the root of the exact equation). The imaginary part shifts the pitch by
/// −(T/L) Im Y rad/s, which is left out here.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct EndLoss(f64);

impl EndLoss {
    /// The real part of the admittance in s/kg; for two ends, their sum.
    ///
    /// # Errors
    /// A value outside [`bounds::ADMITTANCE`].
    pub fn new(conductance_s_per_kg: f64) -> Result<Self> {
        bounds::ADMITTANCE.check(conductance_s_per_kg).map(Self)
    }
}

impl Loss for EndLoss {
    fn decay_rate_per_s(&self, _: u32, _: f64, string: &StringSpec) -> f64 {
        string.tension_n() / string.length_m() * self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn heat_of_steel_wire_peaks_where_it_should() {
        // f d²/χ = q²·2/π at the peak.
        let loss = ThermoelasticLoss::new(0.254e-3, 7_800.0, 190.0e9, &WireThermal::STEEL).unwrap();
        let diffusivity = 49.0 / (7_800.0 * 470.0);
        let ratio = loss.peak_hz() * 0.254e-3_f64.powi(2) / diffusivity;
        assert!((ratio - 2.158_114_110).abs() < 1e-8, "{ratio}");
        assert!((WEIGHT - 0.987_428_114).abs() < 1e-9);
        let peak = loss.loss_factor(loss.peak_hz());
        assert!(peak > loss.loss_factor(0.99 * loss.peak_hz()));
        assert!(peak > loss.loss_factor(1.01 * loss.peak_hz()));
    }
}
