//! oddwell sampler
