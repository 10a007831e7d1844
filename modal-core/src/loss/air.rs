//! Viscous drag of the air on a thin wire.

use core::f64::consts::PI;

use crate::bounds::{self, Bound};
use crate::error::Result;
use crate::loss::Loss;
use crate::string::StringSpec;

const AIR_DENSITY: Bound = Bound {
    name: "density of the air",
    unit: "kg/m³",
    min: 0.0,
    max: 100.0,
};
const AIR_VISCOSITY: Bound = Bound {
    name: "viscosity of the air",
    unit: "Pa·s",
    min: 0.0,
    max: 1.0,
};

/// The gas around the string.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Air {
    density_kg_per_m3: f64,
    viscosity_pa_s: f64,
}

impl Air {
    /// Air at 20 °C and sea level (from memory): 1.204 kg/m³, 18.1 µPa·s.
    pub const ROOM: Self = Self {
        density_kg_per_m3: 1.204,
        viscosity_pa_s: 1.81e-5,
    };

    /// A gas of this density and dynamic viscosity.
    ///
    /// # Errors
    /// A density outside 0 to 100 kg/m³ or a viscosity outside 0 to 1 Pa·s.
    pub fn new(density_kg_per_m3: f64, viscosity_pa_s: f64) -> Result<Self> {
        Ok(Self {
            density_kg_per_m3: AIR_DENSITY.check(density_kg_per_m3)?,
            viscosity_pa_s: AIR_VISCOSITY.check(viscosity_pa_s)?,
        })
    }

    /// Drag in kg/(m·s) per metre of a cylinder that swings at `frequency_hz`:
    /// R = 2π η + 2π d √(π η ρ f) (Stokes' cylinder in the form of Valette 1995;
    /// from memory). A few percent high for thin wires at low pitch.
    #[must_use]
    pub fn drag_kg_per_m_s(&self, diameter_m: f64, frequency_hz: f64) -> f64 {
        let layer = PI * self.viscosity_pa_s * self.density_kg_per_m3 * frequency_hz;
        2.0 * PI * (self.viscosity_pa_s + diameter_m * libm::sqrt(layer))
    }
}

/// σ = R/(2 μ) with the drag R of [`Air`].
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct AirLoss {
    air: Air,
    diameter_m: f64,
}

impl AirLoss {
    /// The loss of a string of outer diameter `diameter_m` in room air.
    ///
    /// # Errors
    /// A diameter outside [`bounds::DIAMETER_M`].
    pub fn new(diameter_m: f64) -> Result<Self> {
        Self::within(Air::ROOM, diameter_m)
    }

    /// The loss in another gas.
    ///
    /// # Errors
    /// A diameter outside [`bounds::DIAMETER_M`].
    pub fn within(air: Air, diameter_m: f64) -> Result<Self> {
        Ok(Self {
            air,
            diameter_m: bounds::DIAMETER_M.check(diameter_m)?,
        })
    }
}

impl Loss for AirLoss {
    fn decay_rate_per_s(&self, _: u32, frequency_hz: f64, string: &StringSpec) -> f64 {
        let drag = self.air.drag_kg_per_m_s(self.diameter_m, frequency_hz);
        drag / (2.0 * string.linear_density_kg_per_m())
    }
}
