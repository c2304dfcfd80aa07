//! Which Jacobi constant is meant.

use crate::decode::choices;

choices! {
    /// `plain`: C = x^2 + y^2 + 2(1-mu)/r1 + 2 mu/r2 - v^2. `symmetric`: C + mu(1-mu), exactly 3 at rest in L4 and L5.
    /// `energy` is -C/2 and `effective_potential` (C + v^2)/2 of the same form.
    pub enum JacobiForm = mechanics::potential::JacobiForm { Plain = "plain", Symmetric = "symmetric" }
}

impl Default for JacobiForm {
    fn default() -> Self {
        mechanics::potential::JacobiForm::default().into()
    }
}
