import './held-random.test.ts';
