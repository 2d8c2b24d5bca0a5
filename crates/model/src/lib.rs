//! oddwell model
