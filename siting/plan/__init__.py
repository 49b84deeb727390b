"""What an answer is: verdicts, flows, cost lines, proof; and the audit that re-checks it. Imports no solver."""
