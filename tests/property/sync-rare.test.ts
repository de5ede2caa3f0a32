import { it } from 'vitest';
import { runSchedules } from './schedules';

it(
	'restored servers, copied profiles, members removed and admitted again, files handed over, wild counters and poison end the same way',
	() => runSchedules(0.6, 'rare'),
	3_600_000
);
