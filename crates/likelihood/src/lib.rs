//! oddwell likelihood
