//! Values of the variables in scope while a term is evaluated.

use crate::num::Scalar;
use std::sync::Arc;

/// Variables with their values, and Cartesian indices with the component they stand for.
#[derive(Clone, Default, Debug)]
pub struct Environment {
    inner: Arc<Inner>,
}

#[derive(Default, Debug)]
struct Inner {
    variables: Vec<(String, Scalar)>,
    indices: Vec<(String, char)>,
    fingerprint: String,
}

impl Environment {
    /// An environment that holds nothing but these variables; indices stay, since they belong to the bracket around.
    pub fn for_call(&self, variables: Vec<(String, Scalar)>) -> Self {
        Self::build(variables, self.inner.indices.clone())
    }

    /// This environment with one more variable, which hides an earlier one of the same name.
    pub fn with(&self, name: &str, value: Scalar) -> Self {
        let mut variables = self.inner.variables.clone();
        variables.retain(|(n, _)| n != name);
        variables.push((name.to_string(), value));
        Self::build(variables, self.inner.indices.clone())
    }

    /// This environment with a Cartesian index fixed to x, y or z.
    pub fn with_index(&self, index: &str, component: char) -> Self {
        let mut indices = self.inner.indices.clone();
        indices.retain(|(n, _)| n != index);
        indices.push((index.to_string(), component));
        Self::build(self.inner.variables.clone(), indices)
    }

    fn build(variables: Vec<(String, Scalar)>, indices: Vec<(String, char)>) -> Self {
        use std::fmt::Write;
        let mut fingerprint = String::new();
        for (name, value) in &variables {
            // Balls print their midpoints and radii in full: equal fingerprints mean equal values.
            let _ = write!(fingerprint, "{name}={value:?};");
        }
        for (name, component) in &indices {
            let _ = write!(fingerprint, "{name}:{component};");
        }
        Environment { inner: Arc::new(Inner { variables, indices, fingerprint }) }
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
