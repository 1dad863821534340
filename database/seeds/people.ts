/** Somebody of the demo. Every name is invented; `.example` is reserved and can belong to nobody. */
export interface DemoPerson {
  name: string
  email: string
  /** Role in the demo's project; administrators belong to the firm instead. */
  role: 'project manager' | 'originator' | 'checker' | 'approver' | 'data' | 'client' | 'administrator'
}

/** One person a role. */
export const demoPeople: DemoPerson[] = [
  { name: 'Ines Marlowe', email: 'ines.marlowe@lavant.example', role: 'originator' },
  { name: 'Tom Okafor', email: 'tom.okafor@lavant.example', role: 'data' },
  { name: 'Ruth Castellan', email: 'ruth.castellan@lavant.example', role: 'project manager' },
  { name: 'Hanne Brevik', email: 'hanne.brevik@lavant.example', role: 'checker' },
  { name: 'Daniel Ashgrove', email: 'daniel.ashgrove@lavant.example', role: 'approver' },
  { name: 'Priya Venn', email: 'priya.venn@quayside.example', role: 'client' },
  { name: 'Owen Tarrant', email: 'owen.tarrant@lavant.example', role: 'administrator' },
]
