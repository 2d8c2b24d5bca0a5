//! oddwell
fn main() {}
