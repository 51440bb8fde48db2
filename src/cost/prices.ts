/** Prices in US dollars, region us-east-1. Lambda and SQS from the vendor's price pages; those marked * from memory.
 *  A desk elsewhere, or later, passes its own. Free tiers are left out. */
export interface Prices {
  readonly lambdaRequestsMillion: number;
  /** arm64. */
  readonly lambdaGbSecond: number;
  readonly sqsRequestsMillion: number;
  /** PUT, COPY, LIST. * */
  readonly s3WritesMillion: number;
  /** GET, HEAD. * */
  readonly s3ReadsMillion: number;
  /** * */
  readonly s3GbMonth: number;
  /** Of a bucket whose events go there. * */
  readonly eventBridgeMillion: number;
  /** * */
  readonly sesMessagesMillion: number;
  /** Of 256 KB each. * */
  readonly sesChunksMillion: number;
  /** Ingested. * */
  readonly logsGb: number;
  /** Each metric that an alarm looks at. * */
  readonly alarmMonth: number;
  /** Each custom metric with its dimensions; by the hour in which it was written. * */
  readonly metricMonth: number;
  /** * */
  readonly dashboardMonth: number;
  /** * */
  readonly secretMonth: number;
}

export const pricesOfUsEast1: Prices = {
  lambdaRequestsMillion: 0.2,
  lambdaGbSecond: 0.0000133334,
  sqsRequestsMillion: 0.4,
  s3WritesMillion: 5,
  s3ReadsMillion: 0.4,
  s3GbMonth: 0.023,
  eventBridgeMillion: 1,
  sesMessagesMillion: 100,
  sesChunksMillion: 90,
  logsGb: 0.5,
  alarmMonth: 0.1,
  metricMonth: 0.3,
  dashboardMonth: 3,
  secretMonth: 0.4,
};
