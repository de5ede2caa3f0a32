import { it } from 'vitest';
import { runSchedules } from './schedules';

it(
	'a crew on bad networks with wrong clocks ends with one log, nothing lost, nothing twice',
	() => runSchedules(0.4, 'ordinary'),
	3_600_000
);
