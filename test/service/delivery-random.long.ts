import './delivery-random.test.ts';
