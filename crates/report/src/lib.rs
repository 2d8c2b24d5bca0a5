//! oddwell report
