//! Values of the variables in scope while a term is evaluated.

use crate::angular::HalfInteger;
use crate::angular::polarization::Polarization;
use crate::num::Scalar;
use std::sync::Arc;

/// Variables with their values, and Cartesian indices with the component they stand for.
#[derive(Clone, Default, Debug)]
pub struct Environment {
    inner: Arc<Inner>,
}

#[derive(Clone, Default, Debug)]
struct Inner {
    variables: Vec<(String, Scalar)>,
    indices: Vec<(String, char)>,
    light: Option<Polarization>,
    projection: Option<HalfInteger>,
    fingerprint: String,
}

impl Environment {
    /// An environment that holds nothing but these variables; what belongs to the bracket around stays: indices, the light and M.
    pub fn for_call(&self, variables: Vec<(String, Scalar)>) -> Self {
        self.changed(|inner| inner.variables = variables)
    }

    /// This environment with one more variable, which hides an earlier one of the same name.
    pub fn with(&self, name: &str, value: Scalar) -> Self {
        self.changed(|inner| {
            inner.variables.retain(|(n, _)| n != name);
            inner.variables.push((name.to_string(), value));
        })
    }

    /// This environment with a Cartesian index fixed to x, y or z.
    pub fn with_index(&self, index: &str, component: char) -> Self {
        self.changed(|inner| {
            inner.indices.retain(|(n, _)| n != index);
            inner.indices.push((index.to_string(), component));
        })
    }

    /// This environment with a polarization where it is left open, and an M for levels named without one.
    pub fn with_level(&self, light: Option<Polarization>, projection: HalfInteger) -> Self {
        self.changed(|inner| {
            inner.light = light;
            inner.projection = Some(projection);
        })
    }

    fn changed(&self, change: impl FnOnce(&mut Inner)) -> Self {
        use std::fmt::Write;
        let mut inner = Inner { fingerprint: String::new(), ..(*self.inner).clone() };
        change(&mut inner);
        let mut fingerprint = String::new();
        for (name, value) in &inner.variables {
            // Balls print their midpoints and radii in full: equal fingerprints mean equal values.
            let _ = write!(fingerprint, "{name}={value:?};");
        }
        for (name, component) in &inner.indices {
            let _ = write!(fingerprint, "{name}:{component};");
        }
        if let Some(light) = &inner.light {
            let _ = write!(fingerprint, "light {:?};", light.cartesian());
        }
        if let Some(projection) = inner.projection {
            let _ = write!(fingerprint, "M={projection};");
        }
        inner.fingerprint = fingerprint;
        Environment { inner: Arc::new(inner) }
    }

    /// The polarization of the light, where one is put in.
    pub fn light(&self) -> Option<&Polarization> {
        self.inner.light.as_ref()
    }

    /// The M of levels that are named without one.
    pub fn projection(&self) -> Option<HalfInteger> {
        self.inner.projection
    }

    /// The variables with a value, with theirs.
    pub fn variables(&self) -> &[(String, Scalar)] {
        &self.inner.variables
    }

    pub fn variable(&self, name: &str) -> Option<&Scalar> {
        self.inner.variables.iter().find(|(n, _)| n == name).map(|(_, value)| value)
    }

    pub fn index(&self, name: &str) -> Option<char> {
        self.inner.indices.iter().find(|(n, _)| n == name).map(|(_, component)| *component)
    }

    /// A text that differs whenever a value differs.
    pub fn fingerprint(&self) -> &str {
        &self.inner.fingerprint
    }
}
