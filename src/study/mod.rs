//! Questions over one or many sections that each take several solves or their derivatives.
