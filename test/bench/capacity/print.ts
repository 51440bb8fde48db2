import { demandOf, deskMax, type LimitName, limits, messagesMax, shardsOf } from './capacity.ts';
import { costs, traffic } from './costs.ts';

/** Rows of the table: each limit, its maximum, what so many messages a month need of it, and the messages at which it is met. */
export function capacityRows(messagesPerMonth: number): string[][] {
  const demand = demandOf({ ...traffic, messagesPerMonth }, costs);
  return (Object.keys(limits) as LimitName[]).map((name) => [
    name,
    String(limits[name].max),
    demand[name].toPrecision(3),
    `${(messagesMax(name, traffic, costs) / 1e6).toPrecision(3)} M`,
  ]);
}

export function capacitySummary(): string {
  const { messages, limit } = deskMax(traffic, costs);
  const shards = [1e6, 1e7, 1e8].map((each) => `${each / 1e6} M: ${shardsOf(each, traffic, costs)}`);
  return `one desk: ${(messages / 1e6).toPrecision(3)} million messages a month, by ${limit}; shards of a larger one: ${shards.join(', ')}`;
}
