import { serveJobs } from '../files/serveJobs.js';
import { trialRunner } from './trialRunner.js';

serveJobs(trialRunner, ({ rows }) => [rows.buffer]);
