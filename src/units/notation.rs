//! Component notation: IEC 60062 letter code and SI writing.

/// Value with an SI prefix and its unit, four significant digits at most.
pub fn engineering(value: f64, symbol: &str) -> String {
    format!("{value} {symbol}")
}
