import './effects.test.ts';
