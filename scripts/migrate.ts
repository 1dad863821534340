import { environment } from '../app/environment.server.ts'
import { migrateDatabase, migrationReport } from './services/migrate-database.ts'
import { reportAndFail } from './services/report-and-fail.ts'

async function migrate(): Promise<void> {
  console.log(migrationReport(await migrateDatabase(environment().database)))
}

await migrate().catch(reportAndFail)
