//! oddwell study
