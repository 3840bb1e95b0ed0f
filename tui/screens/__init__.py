"""Full screens and modal questions."""
