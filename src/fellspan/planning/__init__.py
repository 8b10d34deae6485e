"""Planning: a Study in, a StudyPlan out.

Opens the terrain, assesses each link and gathers what the views show. Reads no study file and writes nothing.
"""
