import './site-mutations.test.ts';
