//! Settings of the study: frequency, site conditions and the limits results are held against.

/// Settings of `study.csv`, with the format's defaults.
#[derive(Debug, Clone, PartialEq)]
pub struct Study {
    /// Name of the network, shown on every output.
    pub name: String,
    /// System frequency, hertz.
    pub frequency_hz: f64,
    /// Conductor temperature for computed constructions, degrees Celsius.
    pub conductor_temperature_c: f64,
    /// Earth resistivity for earth-return impedance, ohm metre.
    pub earth_resistivity_ohm_m: f64,
    /// Lowest acceptable phase voltage, percent of nominal.
    pub voltage_low_percent: f64,
    /// Highest acceptable phase voltage, percent of nominal.
    pub voltage_high_percent: f64,
    /// Greatest acceptable voltage drop from the source (or the last transformer or regulator), percent of nominal.
    pub drop_limit_percent: f64,
    /// Greatest acceptable voltage unbalance factor, percent.
    pub unbalance_limit_percent: f64,
    /// Greatest acceptable neutral-to-earth voltage, volts; `None`: not checked.
    pub neutral_limit_v: Option<f64>,
    /// Greatest acceptable dip while a motor starts, percent.
    pub start_dip_limit_percent: f64,
    /// Below this share of nominal voltage a constant-power load turns smoothly into constant
    /// impedance, percent; 0: never.
    pub constant_power_floor_percent: f64,
    /// Price of energy, in `currency` per kilowatt-hour.
    pub energy_price_per_kwh: Option<f64>,
    /// Currency of prices, as the user writes it.
    pub currency: Option<String>,
    /// Yearly load growth, percent.
    pub load_growth_percent: Option<f64>,
}

impl Default for Study {
    fn default() -> Self {
        Study {
            name: String::new(),
            frequency_hz: 50.0,
            conductor_temperature_c: 75.0,
            earth_resistivity_ohm_m: 100.0,
            voltage_low_percent: 95.0,
            voltage_high_percent: 105.0,
            drop_limit_percent: 5.0,
            unbalance_limit_percent: 3.0,
            neutral_limit_v: None,
            start_dip_limit_percent: 15.0,
            constant_power_floor_percent: 70.0,
            energy_price_per_kwh: None,
            currency: None,
            load_growth_percent: None,
        }
    }
}
