//! oddwell cosmology
