"""One public function per rule of the workflow."""
